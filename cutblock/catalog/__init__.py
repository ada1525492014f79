"""Grades, wires, machines, block sizes and label sheets from TOML files."""
