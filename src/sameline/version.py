"""The version of this Sameline, which every entry and every conclusion names."""

__version__ = "0.1.0"
