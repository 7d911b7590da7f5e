"""Sameline: quality-control laboratory records, and the defended answer to which lots really differ."""

__version__ = "0.1.0"
