"""Pictures of what was measured: Matplotlib figures, made on request and saved by the caller.

Every curve differs from the others by its dashes and its marks as well as by its colour, so that a
page printed in grey reads the same; every axis names its unit.
"""
