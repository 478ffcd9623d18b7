"""Geometry of the ground. No climate, no files."""
