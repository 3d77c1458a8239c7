"""The walk of `make`: recipe, signals, strips, meters, files, verified."""
