"""The walk of `tune`: recipe and limits, search, tuned recipe."""
