"""A caution: something true about the data or the call that a reader of the result must know."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Caution:
    """One thing to know before leaning on a result.

    A caution never changes a figure and never switches a procedure; it stands beside the result.

    Args:
        code: short fixed name for programs, such as "small-groups".
        text: one sentence for a reader, with the figures it rests on.
    """

    code: str
    text: str
