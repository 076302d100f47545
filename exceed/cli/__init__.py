"""Options become a call, findings an exit code."""
