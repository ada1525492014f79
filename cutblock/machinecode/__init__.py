"""Writes the code of a four-axis machine and reads it back."""
