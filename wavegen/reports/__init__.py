"""Tables for people."""
