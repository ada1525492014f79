"""Piece tags: described once, drawn on paper and on screen."""
