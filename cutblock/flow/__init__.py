"""Joins the rooms: one function a step, and the whole chain."""
