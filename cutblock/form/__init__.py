"""Reads every source of a face into one smooth surface, and refuses what is not one."""
