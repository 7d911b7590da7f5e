"""What the ledger refuses, and what a check answers when the answer is no."""

from __future__ import annotations

from sameline.errors import SamelineError


class LedgerError(SamelineError):
    """A value cannot be put into canonical form, or a size, index or key that cannot be meant."""


class FormatError(LedgerError):
    """A checkpoint, proof, signature or key does not read as one."""

    exit_code = 1


class ProofError(LedgerError):
    """A proof or signature was checked and does not hold.

    Args:
        message: what does not hold, one sentence without a full stop.
        got: what was computed or found, if two values were compared.
        want: what was stated, if two values were compared.
        where: the record it concerns, if one.
        advice: what to do about it, if anything helps.
    """

    exit_code = 1

    def __init__(
        self,
        message: str,
        *,
        got: str | None = None,
        want: str | None = None,
        where: str | None = None,
        advice: str | None = None,
    ) -> None:
        compared = f": got {got}, want {want}" if want is not None else ""
        super().__init__(message + compared, where=where, advice=advice)
        self.got = got
        self.want = want
