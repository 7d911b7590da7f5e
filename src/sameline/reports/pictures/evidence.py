"""The picture of evidence: one pair's difference, interval and verdict, look by look."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

from sameline.errors import CallError
from sameline.reports.pictures.captions import conclusion_caption
from sameline.reports.pictures.columns import shortened_words
from sameline.reports.pictures.drawing import Picture, check_width, compose, drawing
from sameline.reports.pictures.forest import ForestRow, Lines, forest
from sameline.reports.pictures.marks import VERDICT_WORDS
from sameline.reports.pictures.pairs import ends_of, forest_lines, headings, pair_row
from sameline.reports.pictures.scale import scale_of
from sameline.reports.text import day, percent

if TYPE_CHECKING:
    from sameline.records.answers import Conclusion, PairAnswer
    from sameline.reports.pictures.content import DrawnRun
    from sameline.reports.subject import Subject


def strongest_pair(versions: Sequence[Conclusion]) -> tuple[str, str]:
    """The pair to show where none is asked for: of those judged in the most versions, the one with strongest evidence.

    Raises:
        CallError: no version judges a pair.
    """
    seen = [[(p.a, p.b) for p in c.answer.pairs if p.difference is not None] for c in versions]
    last = next((c for c, pairs in zip(reversed(versions), reversed(seen), strict=True) if pairs), None)
    if last is None:
        raise CallError(f"{versions[-1].name} has no pair with a difference to draw")
    judged = [p for p in last.answer.pairs if p.difference is not None]
    first = min(
        judged,
        key=lambda p: (
            -sum((p.a, p.b) in pairs for pairs in seen),
            1.0 if p.p_value is None else p.p_value,
            -abs(p.difference or 0.0),
        ),
    )
    return first.a, first.b


def evidence_picture(
    versions: Sequence[Conclusion],
    subject: Subject,
    runs: Sequence[DrawnRun],
    pair: tuple[str, str],
    *,
    width: float = 170.0,
    behind: bool = False,
) -> Picture:
    """Draws how a pair's evidence grew.

    Args:
        versions: of one comparison, oldest first.
        subject: of the latest.
        runs: that the latest rests on.
        pair: labels of two groups, in any order.
        width: in mm.
        behind: whether the comparison is behind the records.

    Raises:
        CallError: the width is none, or no version compared these groups.
    """
    check_width(width)
    seen = [(c, found) for c in versions if (found := _of(c, pair)) is not None]
    if not seen:
        raise CallError(f"no version of {versions[-1].name} has a difference of {pair[0]} and {pair[1]}")
    decimals = subject.decimals + 1
    rows = [_row(c, p, decimals) for c, p in seen]
    first = seen[-1][1]
    lines = Lines(((0.0, "0"),), subject.margin)
    with drawing():
        scale = scale_of(ends_of(rows), () if subject.margin is None else (-subject.margin, subject.margin))
        blocks, short = forest(rows, headings(subject), scale, subject.unit, width, lines)
        told = " ".join(filter(None, (_words(subject, first, seen), _turns(seen, pair), shortened_words(short))))
        caption = conclusion_caption(versions[-1], subject, runs, told, behind=behind)
        subtitle = f"{first.b} minus {first.a}, look by look; {subject.name}, {subject.unit}"
        return compose(width, versions[-1].name, subtitle, blocks, caption, forest_lines(rows, decimals, subject))


def _of(conclusion: Conclusion, pair: tuple[str, str]) -> PairAnswer | None:
    return next((p for p in conclusion.answer.pairs if {p.a, p.b} == set(pair) and p.difference is not None), None)


def _row(c: Conclusion, p: PairAnswer, decimals: int) -> ForestRow:
    look = f"look {c.look}" if c.look else "no look"
    return pair_row(f"v{c.version}, {look}, {day(c.at)}", p, decimals)


def _words(subject: Subject, p: PairAnswer, seen: Sequence[tuple[Conclusion, PairAnswer]]) -> str:
    confidence = percent(1 - subject.revision.alpha)
    band = "" if subject.margin is None else "; hatched: differences below the margin as it is now"
    revisions = {c.revision for c, _ in seen}
    changed = (
        ""
        if len(revisions) == 1
        else f" The comparison was restated in between (revisions {min(revisions)} to {max(revisions)})."
    )
    return (
        f"Each row is a version of the conclusion, oldest first: mean of {p.b} minus mean of {p.a} on the data then "
        f"recorded, with the {confidence} interval as it was then{band}. {VERDICT_WORDS}{changed} "
        "What follows is of the last version."
    )


def _turns(seen: Sequence[tuple[Conclusion, PairAnswer]], pair: tuple[str, str]) -> str:
    found = [
        f"v{c.version}: {turn.before or 'not judged'} to {turn.after}, because of {turn.because}"
        for c, _ in seen
        for turn in c.turns
        if {turn.a, turn.b} == set(pair)
    ]
    return f"Turned: {'; '.join(found)}." if found else ""
