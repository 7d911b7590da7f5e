"""The lab's records: insert-only tables, the store that holds them, one entry an act, and as-of reads.

The only part of the house that knows SQLAlchemy.
"""
