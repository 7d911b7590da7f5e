"""The tamper-evident ledger: bytes in, verdict out."""
