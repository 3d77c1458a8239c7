"""Curve against curve: stimulus and field, input and output of a device."""
