"""The picture of pairs: differences with their simultaneous intervals against zero and the margin."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

from sameline.errors import CallError
from sameline.reports.changes import look_words, tally
from sameline.reports.differ import verdict_words
from sameline.reports.pictures.captions import conclusion_caption
from sameline.reports.pictures.columns import shortened_words
from sameline.reports.pictures.drawing import Picture, check_width, compose, drawing
from sameline.reports.pictures.fitting import safe, shortened
from sameline.reports.pictures.forest import NARROW, ForestRow, Lines, forest
from sameline.reports.pictures.marks import VERDICT_WORDS
from sameline.reports.pictures.plain import axis_lines
from sameline.reports.pictures.scale import scale_of
from sameline.reports.pictures.style import SMALL
from sameline.reports.text import count, interval, number, p_value, percent

if TYPE_CHECKING:
    from sameline.records.answers import Conclusion, PairAnswer
    from sameline.reports.pictures.content import DrawnRun
    from sameline.reports.subject import Subject

MOST_PAIRS = 66
"""All pairs of 12 groups; of more, those with the strongest evidence are drawn, and the caption says so."""


def pairs_picture(
    conclusion: Conclusion, subject: Subject, runs: Sequence[DrawnRun], *, width: float = 170.0, behind: bool = False
) -> Picture:
    """Draws the pairs of a conclusion, in the order of their evidence where there are many, else of the comparison.

    Args:
        conclusion: what is shown.
        subject: what it is about.
        runs: from `content.read_concluded_runs`.
        width: in mm.
        behind: whether the comparison is behind the records.

    Raises:
        CallError: the width is none, or there is no pair to draw.
    """
    check_width(width)
    judged = [p for p in conclusion.answer.pairs if p.difference is not None]
    if not judged:
        raise CallError(f"{conclusion.name} v{conclusion.version} has no pair with a difference to draw")
    drawn = _strongest(judged)
    decimals = subject.decimals + 1
    lines = Lines(((0.0, "0"),), subject.margin)
    words = [_words(subject), _rest(conclusion, drawn)]
    with drawing():
        called, short = _called(drawn, width)
        rows = [pair_row(f"{called[p.b]} minus {called[p.a]}", p, decimals) for p in drawn]
        scale = scale_of(ends_of(rows), () if subject.margin is None else (-subject.margin, subject.margin))
        blocks, _ = forest(rows, headings(subject), scale, subject.unit, width, lines)
        told = " ".join(filter(None, (*words, shortened_words(short))))
        caption = conclusion_caption(conclusion, subject, runs, told, behind=behind)
        return compose(
            width,
            conclusion.name,
            _subtitle(conclusion, subject),
            blocks,
            caption,
            forest_lines(rows, decimals, subject),
        )


def _called(drawn: Sequence[PairAnswer], width: float) -> tuple[dict[str, str], list[tuple[str, str]]]:
    """What each group is called where room is short, and what had to be shortened, as (shown, name)."""
    labels = list(dict.fromkeys(label for p in drawn for label in (p.a, p.b)))
    full = [safe(label) for label in labels]
    names = shortened(full, width * (0.38 if width < NARROW else 0.13), SMALL)
    return dict(zip(labels, names, strict=True)), [(s, n) for s, n in zip(names, full, strict=True) if s != n]


def pair_row(name: str, p: PairAnswer, decimals: int) -> ForestRow:
    """A pair as a row: difference, interval, p-value, verdict."""
    figures = (
        number(p.difference, decimals),
        interval(p.lower, p.upper, decimals),
        p_value(p.p_value),
        verdict_words(p),
    )
    return ForestRow(name, p.lower, p.difference, p.upper, figures, p.verdict)


def headings(subject: Subject) -> tuple[str, ...]:
    """Of a pair's figures."""
    once = subject.revision.looks == "single"
    return "difference", f"{percent(1 - subject.revision.alpha)} interval", "p" if once else "overall p", "verdict"


def ends_of(rows: Sequence[ForestRow]) -> list[float]:
    """Every figure that a scale must hold, zero too."""
    return [0.0, *(x for row in rows for x in (row.lower, row.middle, row.upper) if x is not None)]


def forest_lines(rows: Sequence[ForestRow], decimals: int, subject: Subject) -> list[str]:
    """The rows for a terminal."""
    drawn = [(row.name, row.lower, row.middle, row.upper, "  ".join(row.figures[2:])) for row in rows]
    margin = subject.margin
    return axis_lines(drawn, decimals, (0.0, None if margin is None else -margin, margin), subject.unit)


def _strongest(judged: Sequence[PairAnswer]) -> list[PairAnswer]:
    if len(judged) <= MOST_PAIRS:
        return list(judged)
    strength = sorted(
        judged, key=lambda p: (not p.differs, 1.0 if p.p_value is None else p.p_value, -abs(p.difference or 0.0))
    )
    return strength[:MOST_PAIRS]


def _rest(conclusion: Conclusion, drawn: Sequence[PairAnswer]) -> str:
    pairs = conclusion.answer.pairs
    if len(drawn) == len(pairs):
        return f"All {count(len(pairs), 'pair')}: {tally(conclusion)}." if len(pairs) > 1 else ""
    left = [p for p in pairs if p not in drawn]
    kinds = ", ".join(f"{sum(p.verdict == v for p in left)} {v}" for v in dict.fromkeys(p.verdict for p in left))
    return f"{len(drawn)} of {len(pairs)} pairs, those with the strongest evidence; not drawn: {kinds}."


def _words(subject: Subject) -> str:
    once = subject.revision.looks == "single"
    kind = "simultaneous interval" if once else "interval that holds over all looks"
    band = "" if subject.margin is None else "; hatched: differences below the margin"
    confidence = percent(1 - subject.revision.alpha)
    return f"Mark: the second group's mean minus the first's; line: its {confidence} {kind}{band}. {VERDICT_WORDS}"


def _subtitle(conclusion: Conclusion, subject: Subject) -> str:
    return f"Differences in {subject.name}, {subject.unit}; version {conclusion.version}, {look_words(conclusion.look)}"
