"""A log file becomes a Recording."""
