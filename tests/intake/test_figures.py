from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from sameline.intake.figures import PLAIN, Figure, NoFigure, read_figure


@pytest.mark.parametrize(
    ("text", "figure"),
    [
        ("12.50", Figure("12.50", "12.50", shows=".")),
        (" 5 ", Figure("5", "5")),
        ("+5", Figure("+5", "+5")),
        ("\u22123.2", Figure("-3.2", "-3.2", shows=".")),
        ("12,5", Figure("12,5", "12.5", shows=",")),
        ("0,123", Figure("0,123", "0.123", shows=",")),
        ("1,234", Figure("1,234", "1.234", doubtful=",")),
        ("1.234", Figure("1.234", "1.234", doubtful=".")),
        ("1234.567", Figure("1234.567", "1234.567", shows=".")),
        ("1,234.5", Figure("1,234.5", "1234.5", shows=".")),
        ("1.234,5", Figure("1.234,5", "1234.5", shows=",")),
        ("1 234,5", Figure("1 234,5", "1234.5", shows=",")),
        ("1'234.5", Figure("1'234.5", "1234.5", shows=".")),
        ("1,234,567", Figure("1,234,567", "1234567.0", shows=".")),
        (".5", Figure(".5", "0.5", shows=".")),
        ("1.2E+03", Figure("1.2E+03", "1.2E+03", shows=".")),
        ("<0.5", Figure("<0.5", "0.5", "<", shows=".")),
        ("> 100 MPa", Figure("> 100", "100", ">", "MPa")),
        ("12.5MPa", Figure("12.5", "12.5", unit="MPa", shows=".")),
        ("45 Shore A", Figure("45", "45", unit="Shore A")),
        ("12,5 %", Figure("12,5", "12.5", unit="%", shows=",")),
        ("12 N/mm²", Figure("12", "12", unit="N/mm²")),
    ],
)
def test_figures_as_people_write_them(text: str, figure: Figure):
    assert read_figure(text) == figure


@pytest.mark.parametrize(
    ("text", "decimal", "number"),
    [
        ("1,234", ",", "1.234"),
        ("1,234", ".", "1234"),
        ("1.234", ".", "1.234"),
        ("1.234", ",", "1234"),
        ("1.234,5", ",", "1234.5"),
        ("1,234,567.25", ".", "1234567.25"),
    ],
)
def test_a_stated_decimal_sign_leaves_no_doubt(text: str, decimal, number: str):
    figure = read_figure(text, decimal)
    assert isinstance(figure, Figure)
    assert (figure.number, figure.doubtful) == (number, None)


@pytest.mark.parametrize(("text", "decimal"), [("12.5", ","), ("12,5", "."), ("1.234,5", "."), ("1,234,567", ",")])
def test_figures_that_contradict_the_stated_sign_are_refused(text: str, decimal):
    assert isinstance(read_figure(text, decimal), NoFigure)


@pytest.mark.parametrize("text", ["n/a", "N/A", "NA", "nan", "-", "—", "n.d.", "not tested", "#N/A"])
def test_some_texts_say_that_there_is_no_figure(text: str):
    figure = read_figure(text)
    assert isinstance(figure, NoFigure)
    assert figure.stated


@pytest.mark.parametrize(
    "text",
    ["", "abc", "12 5", "12.5.3", "1,23,4", "1.820,220,25", "--5", "<", "≤0.5", "<=0.5", "١٢", "inf", "5 < 6", "=1+1",
     "#DIV/0!", "1" * 200, "12O.5", "l2.5", "1 2 3", "0x10", "1.5.2026", "10:30"],
)  # fmt: skip
def test_other_texts_are_no_figures_and_say_why(text: str):
    figure = read_figure(text)
    assert isinstance(figure, NoFigure) or figure.unit is not None
    if isinstance(figure, NoFigure):
        assert not figure.stated
        assert figure.problem


def test_letters_among_digits_are_named():
    figure = read_figure("12O.5")
    assert isinstance(figure, NoFigure)
    assert figure.suggestion == "did you mean '120.5'?"


@given(st.decimals(-1_000_000, 1_000_000, allow_nan=False, places=3), st.sampled_from([".", ","]))
def test_grouped_and_plain_writing_are_one_figure(value: object, decimal):
    plain = str(value)
    grouped = f"{value:,}"
    if decimal == ",":
        plain, grouped = plain.replace(".", ","), grouped.translate(str.maketrans(",.", ".,"))
    for text in (plain, grouped):
        figure = read_figure(text, decimal)
        assert isinstance(figure, Figure)
        assert float(figure.number) == float(str(value))


@given(st.text(alphabet="0123456789.,<>+- '%eEMPa²\u00a0", max_size=14))
def test_any_text_is_a_figure_that_floats_or_a_reason(text: str):
    figure = read_figure(text)
    if isinstance(figure, Figure):
        assert float(figure.number) is not None
        assert figure.text.strip() == figure.text
    else:
        assert figure.problem


@given(st.from_regex(PLAIN, fullmatch=True))
def test_plain_figures_are_what_python_reads(text: str):
    figure = read_figure(text, ".")
    assert isinstance(figure, Figure)
    assert float(figure.number) == float(text)
    assert figure.text == text
