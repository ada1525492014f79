"""The volume account and the money."""
