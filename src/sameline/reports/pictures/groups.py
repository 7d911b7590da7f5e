"""The picture of groups: every run and replicate, means with intervals, limits, lines, and brackets over the pairs."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

from sameline.reports.changes import look_words
from sameline.reports.pictures.brackets import Bracket, brackets
from sameline.reports.pictures.captions import conclusion_caption, named
from sameline.reports.pictures.columns import (
    Columns,
    columns,
    heading_width,
    names,
    row,
    shortened_words,
    stretches,
)
from sameline.reports.pictures.drawing import Block, Picture, check_width, compose, drawing
from sameline.reports.pictures.fitting import safe, shortened
from sameline.reports.pictures.marks import RUN_WORDS, STARS_WORDS, draw_mean, draw_runs, special_words, stars
from sameline.reports.pictures.matrix import WORDS as MATRIX_WORDS
from sameline.reports.pictures.matrix import matrix, matrix_lines
from sameline.reports.pictures.plain import axis_lines
from sameline.reports.pictures.scale import Scale, draw_limits, draw_upright, scale_of
from sameline.reports.pictures.style import INK, SMALL, STRONG
from sameline.reports.text import number, percent

if TYPE_CHECKING:
    from matplotlib.axes import Axes

    from sameline.records.answers import Conclusion, GroupAnswer, PairAnswer
    from sameline.reports.pictures.content import DrawnRun
    from sameline.reports.subject import Subject

MOST_BRACKETED = 12
"""With more groups than these a matrix of pairs takes the place of brackets."""
DIFFER, ALIKE = "differ", "alike"
FIELD = 52.0
LEVEL = 3.9
_HEADINGS = ("values", "lines", "letters")


@dataclass(frozen=True, slots=True)
class _Scene:
    """What is drawn: groups in order of mean, their runs, the pairs by labels."""

    conclusion: Conclusion
    subject: Subject
    groups: tuple[GroupAnswer, ...]
    runs: Mapping[str, Sequence[DrawnRun]]
    pairs: Mapping[frozenset[str], PairAnswer]
    marks: str

    @property
    def labels(self) -> list[str]:
        return [g.label for g in self.groups]

    @property
    def decimals(self) -> int:
        return self.subject.decimals + 1

    @property
    def marked(self) -> list[PairAnswer]:
        return [p for p in self.pairs.values() if bool(p.differs) == (self.marks == DIFFER)]


def groups_picture(
    conclusion: Conclusion,
    subject: Subject,
    runs: Sequence[DrawnRun],
    *,
    width: float = 170.0,
    marks: str = DIFFER,
    behind: bool = False,
) -> Picture:
    """Draws the groups of a conclusion.

    Args:
        conclusion: what is shown.
        subject: what it is about.
        runs: from `content.read_concluded_runs`.
        width: in mm.
        marks: "differ" for brackets over pairs that are shown to differ, "alike" for pairs that are not.
        behind: whether the comparison is behind the records; the caption then says so.

    Raises:
        CallError: the width is none, or the columns would be too narrow in it.
    """
    check_width(width)
    scene = _scene(conclusion, subject, runs, marks)
    with drawing():
        return _drawn(scene, width, runs, behind=behind)


def _scene(conclusion: Conclusion, subject: Subject, runs: Sequence[DrawnRun], marks: str) -> _Scene:
    answer = conclusion.answer
    known = sorted((g for g in answer.groups if g.mean is not None), key=lambda g: (g.mean or 0.0, g.label))
    own: dict[str, list[DrawnRun]] = {}
    for run in runs:
        own.setdefault(run.column, []).append(run)
    empty = [g for g in answer.groups if g.mean is None]
    pairs = {frozenset((p.a, p.b)): p for p in answer.pairs}
    return _Scene(conclusion, subject, (*known, *empty), own, pairs, marks)


def _drawn(scene: _Scene, width: float, runs: Sequence[DrawnRun], *, behind: bool) -> Picture:
    values = [v.value for run in runs for v in run.values]
    ends = [e for g in scene.groups for e in (g.mean, g.lower, g.upper) if e is not None]
    scale = scale_of([*values, *ends] or [0.0], (scene.subject.lower, scene.subject.upper))
    many = len(scene.groups)
    crowded = many > MOST_BRACKETED
    brief = shortened([safe(label) for label in scene.labels], width * 0.16, SMALL) if crowded else []
    made = columns(
        max(many, 1), width, heading_width([*_HEADINGS, scene.subject.revision.grouping, *brief], scale.width)
    )
    blocks, short = _blocks(scene, made, scale, brief)
    words = " ".join(filter(None, (_words(scene, runs, crowded=crowded), shortened_words(short))))
    caption = conclusion_caption(scene.conclusion, scene.subject, runs, words, behind=behind)
    return compose(width, scene.conclusion.name, _subtitle(scene), blocks, caption, _told(scene))


def _subtitle(scene: _Scene) -> str:
    c, s = scene.conclusion, scene.subject
    what = f"{named(s.name, s.characteristic)}, {s.unit}; by {s.revision.grouping}"
    return f"{what}; version {c.version}, {look_words(c.look)}"


def _blocks(
    scene: _Scene, made: Columns, scale: Scale, brief: Sequence[str]
) -> tuple[list[Block], list[tuple[str, str]]]:
    naming, short = names(made, scene.subject.revision.grouping, brief or scene.labels)
    blocks = [] if brief else list(_bracketed(scene, made))
    blocks += [made.block(4.0, lambda _axes: None), made.block(FIELD, lambda axes: _field(axes, scene, made, scale))]
    blocks += [*_lined(scene, made), naming]
    blocks.append(
        row(made, "mean", [number(g.mean, scene.decimals) for g in scene.groups], bold=True, ids="mean-figure")
    )
    blocks.append(row(made, "runs", [str(g.runs) for g in scene.groups], ids="runs-figure"))
    blocks.append(row(made, "values", [str(g.replicates) for g in scene.groups], ids="values-figure"))
    if brief:
        blocks.append(matrix(made, scene.labels, scene.pairs, brief))
        short = [(s, n) for s, n in zip(brief, map(safe, scene.labels), strict=True) if s != n]
    return blocks, short


def _field(axes: Axes, scene: _Scene, made: Columns, scale: Scale) -> None:
    draw_upright(axes, scale, scene.subject.unit)
    draw_limits(axes, scale, scene.subject.lower, scene.subject.upper, scene.subject.unit)
    for at, group in enumerate(scene.groups):
        draw_runs(axes, at, scene.runs.get(group.label, ()), (-0.36, 0.1), made.each)
        if group.mean is not None:
            draw_mean(axes, at + 0.3, group.mean, group.lower, group.upper, f"group-{at + 1}")


def _lined(scene: _Scene, made: Columns) -> Iterator[Block]:
    display = scene.conclusion.answer.display
    letters = sorted({letter for g in scene.groups for letter in g.letters})
    if display == "lines" and letters:
        places = {one: [at for at, g in enumerate(scene.groups) if one in g.letters] for one in letters}
        yield stretches(made, "lines", [(min(on), max(on)) for on in places.values()])
    elif display == "letters" and letters:
        yield row(made, "letters", [g.letters for g in scene.groups], bold=True)


def _bracketed(scene: _Scene, made: Columns) -> Iterator[Block]:
    place = {label: at for at, label in enumerate(scene.labels)}
    found = brackets((place[p.a], place[p.b]) for p in scene.marked)
    if not found:
        return
    high = LEVEL * (1 + max(b.level for b in found)) + 1.6

    def draw(axes: Axes) -> None:
        axes.set_ylim(0, high)
        for each in found:
            _bracket(axes, scene, each)

    yield made.block(high, draw)


def _bracket(axes: Axes, scene: _Scene, each: Bracket) -> None:
    labels = scene.labels
    y = 1.9 + LEVEL * each.level
    ink = STRONG if scene.marks == DIFFER else INK
    axes.plot([each.first, each.last], [y, y], color=ink, lw=0.7)
    axes.plot([each.at, each.at], [y - 1.9, y + 0.9], color=ink, lw=2.0)
    for other in each.others:
        pair = scene.pairs[frozenset((labels[each.at], labels[other]))]
        heavy = pair.verdict == "differs and matters"
        axes.plot([other, other], [y - 0.9, y], color=ink, lw=2.0 if heavy else 0.7)
        sign = _sign(pair)
        axes.text(other, y - 0.15 if pair.differs else y + 0.45, sign, size=SMALL + 0.6, ha="center", color=ink)


def _sign(pair: PairAnswer) -> str:
    if pair.differs:
        return stars(pair)
    return "=" if pair.verdict == "equivalent" else "?"


def _words(scene: _Scene, runs: Sequence[DrawnRun], *, crowded: bool) -> str:
    revision = scene.subject.revision
    confidence = percent(1 - revision.alpha)
    p = "p" if revision.looks == "single" else "overall p"
    words = [
        f"{RUN_WORDS}{special_words(runs)}; disc: the group's mean with its own {confidence} interval, for one look."
    ]
    if any(g.letters for g in scene.groups) and scene.conclusion.answer.display == "lines":
        words.append("Groups along one line are not shown to differ.")
    elif scene.conclusion.answer.display == "letters":
        words.append("Groups that share a letter are not shown to differ.")
    elif scene.conclusion.answer.display == "control":
        words.append("Each group is compared with the control only.")
    if crowded:
        words.append(MATRIX_WORDS)
    elif scene.marks == ALIKE:
        words.append(
            "Marked are only pairs NOT shown to differ, long bar with each short bar: = equivalent within the margin, "
            "? undecided."
        )
    elif scene.marked:
        words.append(
            f"Long bar and each short bar: {STARS_WORDS.format(p=p)}; thick short bar: by more than the margin."
        )
    else:
        words.append("No pair is shown to differ, so there are no brackets.")
    return " ".join(words)


def _told(scene: _Scene) -> list[str]:
    drawn = [(g.label, g.lower, g.mean, g.upper, f"n {g.runs}/{g.replicates}  {g.letters}") for g in scene.groups]
    lines = axis_lines(drawn, scene.decimals, (scene.subject.lower, scene.subject.upper), scene.subject.unit)
    return [*lines, "", *matrix_lines(scene.labels, scene.pairs)]
