"""Readings of plots, what they are worth in their zone, and why."""
