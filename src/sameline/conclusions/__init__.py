"""Comparisons and records in, conclusion versions out: what is behind, what the answer is, what changed and why."""
