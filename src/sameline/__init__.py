"""Sameline: quality-control laboratory records, and the defended answer to which lots really differ."""

from __future__ import annotations

from typing import TYPE_CHECKING

from sameline.version import __version__

if TYPE_CHECKING:
    from sameline.lab import Lab, open_lab

__all__ = ["Lab", "__version__", "open_lab"]


def __getattr__(name: str) -> object:
    """Load the laboratory's face when it is first used, so that importing Sameline costs nothing."""
    if name in {"Lab", "open_lab"}:
        from sameline import lab

        return getattr(lab, name)
    raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
