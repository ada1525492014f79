"""Decides which halves serve what."""
