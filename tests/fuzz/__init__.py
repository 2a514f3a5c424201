"""Anything thrown at the readers and at whole runs: what comes back is an answer or one line."""
