"""Figures read back from the SVG, as text and as places on the drawn scale, are the conclusion's."""

from __future__ import annotations

import re
import xml.etree.ElementTree as ET

import pytest

from sameline.reports.pictures.evidence import evidence_picture
from sameline.reports.pictures.groups import groups_picture
from sameline.reports.pictures.pairs import pairs_picture
from sameline.reports.text import interval, number, p_value

SVG = "{http://www.w3.org/2000/svg}"
LINK = "{http://www.w3.org/1999/xlink}href"


class Read:
    """An SVG as its reader has it."""

    def __init__(self, picture) -> None:
        self.root = ET.fromstring(picture.svg())  # noqa: S314 - our own picture
        self.by_id = {e.get("id"): e for e in self.root.iter() if e.get("id")}
        self.texts = ["".join(e.itertext()) for e in self.root.iter(f"{SVG}text")]

    def text(self, name):
        return "".join(self.by_id[name].itertext()).strip()

    def path(self, name):
        (path,) = [e for e in self.by_id[name].iter(f"{SVG}path") if e.get("d") and e.get("clip-path", "x")]
        return [tuple(map(float, pair)) for pair in re.findall(r"[ML] (\S+) (\S+)", path.get("d"))]

    def mark(self, name):
        (use,) = self.by_id[name].iter(f"{SVG}use")
        return float(use.get("x")), float(use.get("y"))

    def scale(self, axis):
        """From places on the sheet to figures, by the first and last mark of the scale."""
        marks = {float(k.removeprefix("scale-")): self.path(k)[0][axis] for k in self.by_id if k.startswith("scale-")}
        (low, at_low), (high, at_high) = min(marks.items()), max(marks.items())
        return lambda place: low + (place - at_low) / (at_high - at_low) * (high - low)


@pytest.mark.parametrize(("many", "width"), [(2, 170), (6, 85), (20, 85)])
def test_groups_stand_at_their_means_and_intervals(scene, many, width):
    conclusion, subject, runs = scene(many)
    read = Read(groups_picture(conclusion, subject, runs, width=width))
    figure = read.scale(1)
    ordered = sorted(conclusion.answer.groups, key=lambda g: (g.mean, g.label))
    for place, group in enumerate(ordered, 1):
        assert read.text(f"mean-figure-{place}") == number(group.mean, 2)
        assert read.text(f"runs-figure-{place}") == str(group.runs)
        assert read.text(f"values-figure-{place}") == str(group.replicates)
        assert figure(read.mark(f"group-{place}-mean")[1]) == pytest.approx(group.mean, abs=1e-4)
        ends = [figure(y) for _, y in read.path(f"group-{place}-interval")]
        assert ends == pytest.approx([group.lower, group.upper], abs=1e-4)


def test_every_run_stands_at_its_mean(scene):
    conclusion, subject, runs = scene(4)
    read = Read(groups_picture(conclusion, subject, runs))
    figure = read.scale(1)
    for run in runs:
        assert figure(read.path(f"run-{run.run}-mean")[0][1]) == pytest.approx(run.mean, abs=1e-4)


@pytest.mark.parametrize("width", [85, 170])
def test_pairs_stand_at_their_differences_and_their_figures_are_text(scene, width):
    conclusion, subject, runs = scene(5)
    read = Read(pairs_picture(conclusion, subject, runs, width=width))
    figure = read.scale(0)
    text = "\n".join(read.texts)
    for place, pair in enumerate(conclusion.answer.pairs, 1):
        assert figure(read.mark(f"row-{place}-middle")[0]) == pytest.approx(pair.difference, abs=1e-4)
        ends = [figure(x) for x, _ in read.path(f"row-{place}-interval")]
        assert ends == pytest.approx([pair.lower, pair.upper], abs=1e-4)
        for said in (f"{pair.b} minus {pair.a}", number(pair.difference, 2), p_value(pair.p_value)):
            assert said in text
        assert interval(pair.lower, pair.upper, 2) in text
    assert figure(read.path("margin-upper")[0][0]) == pytest.approx(subject.margin, abs=1e-4)


def test_limits_stand_where_they_are(scene):
    conclusion, subject, runs = scene(6, lower=19.0, upper=27.5)
    read = Read(groups_picture(conclusion, subject, runs))
    figure = read.scale(1)
    assert figure(read.path("limit-lower")[0][1]) == pytest.approx(19.0, abs=1e-4)
    assert figure(read.path("limit-upper")[0][1]) == pytest.approx(27.5, abs=1e-4)


def test_evidence_has_a_row_a_version(scene):
    versions = [scene(3, runs=n, seed=5)[0] for n in (2, 4, 8)]
    _, subject, runs = scene(3, runs=8, seed=5)
    read = Read(evidence_picture(versions, subject, runs, ("B-3", "B-1")))
    figure = read.scale(0)
    for place, version in enumerate(versions, 1):
        pair = next(p for p in version.answer.pairs if (p.a, p.b) == ("B-1", "B-3"))
        assert figure(read.mark(f"row-{place}-middle")[0]) == pytest.approx(pair.difference, abs=1e-4)
