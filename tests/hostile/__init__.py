"""Input that nobody should hand to a program, and what must come of it."""
