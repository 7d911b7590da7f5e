"""Codes in a file against the codes that are registered."""

from __future__ import annotations

from collections.abc import Collection

from sameline.intake.nearest import Nearest, did_you_mean
from sameline.records.drafts import CharacteristicFacts, Register

Checked = tuple[str | None, str | None, str | None]
"""The code, or None; what is wrong, or None; the suggestion, or None."""

_WORDS = {"batch": "batch", "characteristic": "characteristic", "analyst": "person", "instrument": "instrument"}
_NEEDED = frozenset({"batch", "characteristic"})
_KEPT = 50_000


class Codes:
    """Looks up codes; each text once.

    Args:
        register: what is registered.
    """

    def __init__(self, register: Register) -> None:
        self._register = register
        self._known: dict[str, Collection[str]] = {
            "batch": register.batches,
            "characteristic": register.characteristics,
            "analyst": register.people,
            "instrument": register.instruments,
        }
        self._nearest: dict[str, Nearest] = {}
        self._unknown: dict[tuple[str, str], Checked] = {}

    def facts(self, characteristic: str) -> CharacteristicFacts | None:
        """What is registered of a characteristic."""
        return self._register.characteristics.get(characteristic)

    def all_known(self, key: tuple[str, ...]) -> bool:
        """Whether all codes of a run's key are registered as they stand (no person or instrument is also right)."""
        batch, characteristic, _, analyst, instrument, _ = key
        register = self._register
        return (
            batch in register.batches
            and characteristic in register.characteristics
            and (not analyst or analyst in register.people)
            and (not instrument or instrument in register.instruments)
        )

    def check(self, field: str, text: str) -> Checked:
        """The code that a cell names (blanks around it do not count)."""
        if text in self._known[field]:
            return text, None, None
        if not text:
            return (None, f"the {_WORDS[field]} is empty", None) if field in _NEEDED else (None, None, None)
        checked = self._unknown.get((field, text))
        if checked is None:
            near = did_you_mean(self._to_nearest(field).to(text))
            problem = f"{_WORDS[field]} {text!r} is not registered"
            checked = (None, problem, near or f"register it, or write a registered {_WORDS[field]}")
            if len(self._unknown) < _KEPT:
                self._unknown[field, text] = checked
        return checked

    def _to_nearest(self, field: str) -> Nearest:
        if field not in self._nearest:
            self._nearest[field] = Nearest(self._known[field])
        return self._nearest[field]
