"""Errors, progress, array checks, units, tolerances and the assets folder."""
