"""Physics: zones, breeze, wind, cold air. Fields and numbers in, new ones out."""
