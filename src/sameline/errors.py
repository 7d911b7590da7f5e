"""What can go wrong, said so that the reader knows what to do.

Every refusal in Sameline is one of these. `SamelineError` carries three things: what is wrong, where, and what
to do about it. The command line turns it into a message and an exit code once, at the edge (`sameline.cli`).

Exit codes: 1 the answer is no (a check failed, an input file has findings); 2 the call was wrong;
3 the store cannot be used.
"""

from __future__ import annotations


class SamelineError(Exception):
    """A refusal, with where it happened and what to do.

    Args:
        message: what is wrong, one sentence without a full stop.
        where: the file, row, option or record it concerns, if one.
        advice: what to do about it, if anything helps.
    """

    exit_code = 2

    def __init__(self, message: str, *, where: str | None = None, advice: str | None = None) -> None:
        super().__init__(message)
        self.message = message
        self.where = where
        self.advice = advice

    def __str__(self) -> str:
        place = f"{self.where}: " if self.where else ""
        advice = f" ({self.advice})" if self.advice else ""
        return f"{place}{self.message}{advice}"


class CallError(SamelineError):
    """The call was wrong: an option, a name or a value that cannot be meant."""


class StatsError(SamelineError):
    """The figures asked for cannot be had from these data or options; the message says why."""


class FindingsError(SamelineError):
    """Input was read and found wanting; nothing was stored. `findings` lists every problem."""

    exit_code = 1

    def __init__(
        self, message: str, findings: list[str], *, where: str | None = None, advice: str | None = None
    ) -> None:
        super().__init__(message, where=where, advice=advice)
        self.findings = findings


class KnownAlreadyError(FindingsError):
    """Everything that the input holds is recorded already."""


class CheckFailedError(SamelineError):
    """A check was made and the answer is no."""

    exit_code = 1


class StoreError(SamelineError):
    """The store cannot be used: missing, damaged, of another version, locked or read-only."""

    exit_code = 3
