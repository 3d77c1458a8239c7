"""The words every room speaks: signals, their evaluation, rendering, errors, units, data words."""
