"""Pictures are honest by themselves, the same on every run, safe with any text, and readable at every width."""

from __future__ import annotations

import io
import itertools
import re
import subprocess
import sys
import xml.etree.ElementTree as ET
from dataclasses import replace

import pytest
from matplotlib.backends.backend_agg import FigureCanvasAgg
from PIL import Image

from sameline.errors import CallError
from sameline.records.answers import CautionAnswer
from sameline.reports.pictures.content import DrawnValue, Shown
from sameline.reports.pictures.drawing import drawing
from sameline.reports.pictures.evidence import evidence_picture, strongest_pair
from sameline.reports.pictures.fitting import safe, shortened, width_of, wrapped
from sameline.reports.pictures.groups import ALIKE, groups_picture
from sameline.reports.pictures.over_time import over_time_picture
from sameline.reports.pictures.pairs import pairs_picture
from sameline.reports.pictures.power import power_picture
from sameline.reports.pictures.spread import spread_picture

HOSTILE = (
    "$x_1$ \\frac{1}{2}",
    "<b>&amp;</b>\"'",
    "]]><script>alert(1)</script>",
    "橡胶 резина 🧪",
    "\u202egnirts \x1b[31m \x00",
)
LONG = [f"Formulation {n} with a name that is far longer than any column, drum {n}" for n in range(1, 14)]


def texts(svg):
    return "\n".join("".join(e.itertext()) for e in ET.fromstring(svg).iter("{http://www.w3.org/2000/svg}text"))  # noqa: S314


def shown(runs, **other):
    parts = {
        "lower": None,
        "upper": 30.0,
        "decimals": 1,
        "safety_critical": False,
        "filter": "all batches",
        "position": 41,
    }
    return Shown("HARD", "Hardness", "in-house 4", "degree", runs=runs, **{**parts, **other})


@pytest.fixture
def every(scene):
    """Every kind of picture of one scene."""

    def draw(width, labels=5):
        from sameline.conclusions.planning import Wanted, sizes
        from sameline.stats import fit_nested

        conclusion, subject, runs = scene(labels)
        rows = [(v.value, run.column, run.run) for run in runs for v in run.values]
        fit = fit_nested([r[0] for r in rows], None, [r[1] for r in rows], [r[2] for r in rows])
        plans = sizes(fit.components, "invented", Wanted(3, 2.0, 0.8, 0.05, "tukey"))
        return {
            "groups": groups_picture(conclusion, subject, runs, width=width),
            "alike": groups_picture(conclusion, subject, runs, width=width, marks=ALIKE),
            "pairs": pairs_picture(conclusion, subject, runs, width=width),
            "evidence": evidence_picture([conclusion], subject, runs, strongest_pair([conclusion]), width=width),
            "over time": over_time_picture(shown(runs), width=width),
            "spread": spread_picture(fit, shown(runs), width=width),
            "power": power_picture(plans, "a plan", "degree", width=width),
        }

    return draw


def text_boxes(picture):
    """Every text of a picture with its place on the sheet, in pixels of 1/100 inch."""
    with drawing():
        canvas = FigureCanvasAgg(picture.figure)
        canvas.draw()
        found = picture.figure.findobj(lambda artist: hasattr(artist, "get_text") and artist.get_text())
        assert all(text.get_fontsize() >= 6.0 for text in found)
        return [(text.get_text(), text.get_window_extent(canvas.get_renderer())) for text in found]


@pytest.mark.parametrize("width", [85, 170])
def test_no_text_leaves_the_sheet_or_is_too_small(every, width):
    for kind, picture in every(width).items():
        sheet = picture.figure.bbox.padded(0.5)
        for text, box in text_boxes(picture):
            assert sheet.containsx(box.x0), (kind, text)
            assert sheet.containsx(box.x1), (kind, text)
            assert sheet.containsy(box.y0), (kind, text)
            assert sheet.containsy(box.y1), (kind, text)


@pytest.mark.parametrize(("labels", "width"), [(6, 85), (12, 85), (20, 85), (tuple(LONG[:4]), 85), (tuple(LONG), 170)])
def test_no_two_texts_lie_on_each_other(scene, labels, width):
    """Stars may touch the line of their bracket, never each other or anything else that is text."""
    conclusion, subject, runs = scene(labels if isinstance(labels, int) else list(labels), upper=60.0)
    drawn = [groups_picture(conclusion, subject, runs, width=width)]
    if len(conclusion.answer.groups) <= 6:
        drawn.append(pairs_picture(conclusion, subject, runs, width=width))
    for picture in drawn:
        boxes = text_boxes(picture)
        for (one, box), (other, its) in itertools.combinations(boxes, 2):
            assert not box.padded(-0.6).overlaps(its.padded(-0.6)), (one, other)


def test_the_bytes_are_the_same_on_every_run(every):
    for first, again in zip(every(85).values(), every(85).values(), strict=True):
        svg = first.svg()
        assert svg == again.svg()
        assert b"dc:date" not in svg
    assert first.svg() == svg
    assert first.png(60) == again.png(60)


def test_another_process_writes_the_same_bytes():
    code = (
        "import hashlib\n"
        "from sameline.conclusions.planning import Wanted, sizes\n"
        "from sameline.reports.pictures.power import power_picture\n"
        "p = power_picture(sizes({'run': 1.0}, 'x', Wanted(3, 2.0, 0.8, 0.05, 'tukey')), 'x', 'mm')\n"
        "digest = hashlib.sha256(p.svg() + p.png(60)).hexdigest()\n"
    )
    here: dict[str, str] = {}
    exec(code, here)  # noqa: S102 - the same lines here and there are the point
    there = subprocess.run(
        [sys.executable, "-c", code + "print(digest)"],
        capture_output=True,
        text=True,
        check=True,
        env={"PYTHONHASHSEED": "7"},
    )
    assert there.stdout.strip() == here["digest"]


def test_the_text_stays_text_and_its_typeface_is_inside(every):
    for picture in every(85).values():
        svg = picture.svg()
        root = ET.fromstring(svg)  # noqa: S314 - our own
        assert root.find("{http://www.w3.org/2000/svg}desc").text == picture.caption
        assert root.find("{http://www.w3.org/2000/svg}title").text == picture.title
        assert b"@font-face" in svg
        assert set(re.findall(rb"url\((?!#)(.{20})", svg)) == {b"data:font/ttf;base64"}
        assert picture.caption.split()[0] in texts(svg)


def test_a_caption_holds_what_keeps_it_honest(scene):
    conclusion, subject, runs = scene(3, subject={"critical": True})
    answer = replace(
        conclusion.answer,
        cautions=(CautionAnswer("set aside", "2 values of 1 run are set aside; no verdict would turn"),),
    )
    aside = tuple(replace(runs[0].values[0], aside="specimen damaged") for _ in range(2))
    runs = (replace(runs[0], values=(*aside, *runs[0].values)), *runs[1:])
    caption = groups_picture(replace(conclusion, answer=answer), subject, runs, behind=True).caption
    for said in (
        "Tukey-Kramer with one common spread of run values", "in degree", "in-house 4",
        "error rate 5 % over all pairs, at one look",
        "Version 3, look 3", "n: 9 runs, 27 values in 3 groups", "Records up to ledger entry 41", "entry 42",
        "Set aside (2 values: specimen damaged). 2 values of 1 run are set aside; no verdict would turn.",
        "margin 2 degree",
        "BEHIND", "It releases no part", "competent person", "cross: set aside",
    ):  # fmt: skip
        assert said in caption, said


def test_marks_for_what_is_alike_say_so(scene):
    conclusion, subject, runs = scene(5, step=0.6)
    picture = groups_picture(conclusion, subject, runs, marks=ALIKE)
    assert "only pairs NOT shown to differ" in picture.caption
    assert "*" not in texts(picture.svg())


@pytest.mark.parametrize("text", HOSTILE)
def test_any_text_is_only_text(scene, text):
    labels = [f"{text} {n}" for n in (1, 2, 3)]
    conclusion, subject, runs = scene(
        labels, name=text, subject={"name": text, "unit": text, "method": text}, upper=23.0
    )
    for picture in (
        groups_picture(conclusion, subject, runs, width=85),
        pairs_picture(conclusion, subject, runs, width=85),
    ):
        root = ET.fromstring(picture.svg())  # noqa: S314 - whether it is well-formed is the question
        assert not [e for e in root.iter() if e.tag.rpartition("}")[2] in {"script", "b", "image", "foreignObject"}]
        assert safe(text) in root.find("{http://www.w3.org/2000/svg}desc").text
        assert "$" not in text or "$x_1$" in texts(picture.svg())
        assert picture.png(60).startswith(b"\x89PNG")


def test_control_and_turning_characters_are_shown_as_unreadable():
    assert safe("a\x00b\u202ec\nd\ud800") == "a\ufffdb\ufffdc d\ufffd"


def test_shortened_names_fit_stay_apart_and_are_told(scene):
    short = shortened(LONG, 20.0, 6.0)
    assert len(set(short)) == len(LONG)
    assert all(width_of(name, 6.0) <= 20.5 for name in short)
    same = [f"{'a' * 40}{n}{'b' * 40}" for n in range(5)]
    assert len(set(shortened(same, 15.0, 6.0))) == 5
    conclusion, subject, runs = scene(LONG)
    caption = groups_picture(conclusion, subject, runs, width=170).caption
    assert all(name in caption for name in LONG)


def test_words_longer_than_a_line_are_broken():
    lines = wrapped("x" * 200 + " end", 20.0, 6.0)
    assert "".join(lines).replace(" ", "") == "x" * 200 + "end"
    assert all(width_of(line, 6.0) <= 20.0 for line in lines)


def test_beyond_twelve_groups_a_matrix_takes_the_place_of_brackets(scene):
    few, many = (groups_picture(*scene(n)) for n in (12, 13))
    assert "Long bar" in few.caption
    assert "Matrix" not in few.caption
    assert "Matrix" in many.caption
    assert "Long bar" not in many.caption


def test_of_very_many_pairs_the_strongest_are_drawn_and_it_says_so(scene):
    conclusion, subject, runs = scene(13, step=0.3)
    picture = pairs_picture(conclusion, subject, runs)
    assert "66 of 78 pairs, those with the strongest evidence; not drawn: " in picture.caption


def test_too_many_columns_are_refused_with_the_width_it_takes(scene):
    conclusion, subject, runs = scene(40)
    with pytest.raises(CallError, match=r"choose a width of 1\d\d mm"):
        groups_picture(conclusion, subject, runs, width=85)
    assert groups_picture(conclusion, subject, runs, width=170).png(50)
    with pytest.raises(CallError, match="cannot be 20 mm wide"):
        groups_picture(conclusion, subject, runs, width=20)


def test_amendments_exclusions_and_bounds_are_marked_and_named(scene):
    _, _, runs = scene(3)
    values = (DrawnValue(20.0, amended=True), DrawnValue(24.0, aside="instrument fault"), DrawnValue(19.0, bound="<"))
    marked = (replace(runs[0], values=values), *runs[1:])
    plain, picture = over_time_picture(shown(runs)), over_time_picture(shown(marked))
    for said in (
        "triangle around: amended",
        "cross: set aside",
        "small triangle: only a bound",
        "1 value: instrument fault",
    ):
        assert said in picture.caption
        assert said not in plain.caption
    assert "Procedure: none" in picture.caption
    assert any("1 set aside, 1 amended" in line for line in picture.text)
    assert picture.png(80) != plain.png(80)


def test_in_grey_every_verdict_has_a_form_of_its_own():
    from sameline.reports.pictures.style import FILLED, MARKERS

    forms = {(marker, verdict in FILLED) for verdict, marker in MARKERS.items()}
    assert len(forms) == len(MARKERS)


@pytest.mark.parametrize("width", [85, 170])
def test_a_png_is_as_wide_as_asked(scene, width):
    image = Image.open(io.BytesIO(groups_picture(*scene(3), width=width).png(300)))
    assert image.width == pytest.approx(width / 25.4 * 300, abs=1.5)


def test_a_comparison_without_an_answer_shows_its_runs_and_says_why(scene):
    conclusion, subject, runs = scene(2)
    groups = tuple(replace(g, mean=None, lower=None, upper=None, letters="") for g in conclusion.answer.groups)
    answer = replace(
        conclusion.answer, state="not computed", reason="no spread", groups=groups, pairs=(), display="matrix"
    )
    silent = replace(conclusion, answer=answer)
    assert "Not computed: no spread." in groups_picture(silent, subject, runs).caption
    with pytest.raises(CallError, match="no pair"):
        pairs_picture(silent, subject, runs)
    with pytest.raises(CallError, match="no pair"):
        strongest_pair([silent])


def test_the_text_form_says_the_same(scene):
    conclusion, subject, runs = scene(3)
    told = "\n".join(groups_picture(conclusion, subject, runs).text)
    for group in conclusion.answer.groups:
        assert group.label in told
        assert f"{group.mean:.2f}" in told
    assert "Tukey-Kramer" in told
