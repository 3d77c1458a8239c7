"""Crest-factor reduction."""
