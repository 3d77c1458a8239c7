"""What converters and the path to the device do to a signal, and how it is put right before."""
