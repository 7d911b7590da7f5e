"""What an act changed, in one line a comparison: "seal set v4: B-117 and B-121 now differ (v3: undecided)"."""

from __future__ import annotations

from sameline.records.answers import ANSWERED, Conclusion, Turn
from sameline.reports.text import count

_MOST = 3

SAYS = {
    "differs and matters": "differ by more than the margin",
    "differs": "differ",
    "equivalent": "are equivalent within the margin",
    "undecided": "are undecided",
}
"""Verdict -> what is said of its pair."""


def change_line(conclusion: Conclusion) -> str:
    """What a new version says that the one before did not."""
    head = f"{conclusion.name} v{conclusion.version}"
    answer = conclusion.answer
    if answer.state != ANSWERED:
        return f"{head}: not computed: {answer.reason}"
    if not conclusion.turns:
        return f"{head}: {tally(conclusion)}; nothing turned"
    said = [turn_words(turn, conclusion.version) for turn in conclusion.turns[:_MOST]]
    if len(conclusion.turns) > _MOST:
        said.append(f"and {count(len(conclusion.turns) - _MOST, 'more verdict')} turned")
    return f"{head}: {'; '.join(said)}"


def turn_words(turn: Turn, version: int) -> str:
    """One verdict that turned: "B-117 and B-121 now differ (v3: undecided)"."""
    before = "" if turn.before is None or version == 1 else f" (v{version - 1}: {turn.before})"
    return f"{turn.a} and {turn.b} now {SAYS[turn.after]}{before}"


def look_words(look: int) -> str:
    """Which look a conclusion was; before there is anything to judge there is none."""
    return f"look {look}" if look else "no look"


def tally(conclusion: Conclusion) -> str:
    """How many pairs have which verdict: "3 of 10 pairs differ, 2 equivalent, 5 undecided"."""
    pairs = conclusion.answer.pairs
    differ = sum(bool(p.differs) for p in pairs)
    alike = sum(p.verdict == "equivalent" for p in pairs)
    open_ = sum(p.verdict == "undecided" for p in pairs)
    parts = [f"{differ} of {count(len(pairs), 'pair')} shown to differ"]
    if alike:
        parts.append(f"{alike} equivalent")
    if open_:
        parts.append(f"{open_} undecided")
    return ", ".join(parts)
