"""Make, tune and prove RF test stimuli from recipes, with their power statistics."""

__version__ = "0.1.0"
