"""Runs one long request in a process of its own."""
