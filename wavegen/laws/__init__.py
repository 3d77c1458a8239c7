"""Laws of the envelope: what mathematics says of a signal's power distribution."""
