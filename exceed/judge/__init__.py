"""A Trace and rules become Findings."""
