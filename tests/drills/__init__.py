"""Drills: the whole program, from a log and an aircraft file that the test writes to the summary, rule by rule."""
