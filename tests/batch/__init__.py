"""Many logs: processes, a cluster, what is interrupted, killed, too large or far away."""
