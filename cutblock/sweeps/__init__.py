"""Fits every panel with ruled sweeps a straight wire can make."""
