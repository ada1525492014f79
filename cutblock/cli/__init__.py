"""Reads the command line."""
