"""A Recording becomes a Trace: every derived quantity, with its method."""
