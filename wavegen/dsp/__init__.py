"""Signal processing that has never heard of a recipe."""
