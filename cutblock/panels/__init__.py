"""Divides faces into panels, each in a frame of its own."""
