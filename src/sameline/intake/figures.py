"""A value cell as people write it, taken apart: qualifier, number, unit, and how sure the decimal sign is.

A comma or a point followed by exactly three digits can be a decimal sign or a thousands separator. Where a file's map
does not say which, such a figure is read with the sign as decimal sign and marked `doubtful`; the other figures of
the file then prove it or leave it in doubt (`sameline.intake.decimals`).
"""

from __future__ import annotations

import re
from dataclasses import dataclass
from typing import Literal

DecimalSign = Literal[".", ","]
_Number = tuple[str, DecimalSign | None, DecimalSign | None]

PLAIN = re.compile(r"[+-]?\d{1,15}(?:\.\d{1,15})?", re.ASCII)
_FIGURE = re.compile(
    r"(?P<qualifier>[<>]?)\s*(?P<sign>[+-]?)\s?(?P<digits>[\d.,' ]*\d[.,]?)(?P<exponent>[eE][+-]?\d{1,4})?\s*"
    r"(?P<unit>[^\d\s.,'<>+-].*)?",
    re.ASCII,
)
_NO_FIGURE = frozenset(
    [
        "n/a",
        "na",
        "n.a.",
        "n.a",
        "#n/a",
        "nan",
        "null",
        "none",
        "nil",
        "missing",
        "-",
        "--",
        "---",
        "–",
        "—",
        ".",
        "?",
        "n.d.",
        "nd",
        "n.d",
        "void",
    ]
) | {
    "not tested",
    "not measured",
}
_ERRORS = frozenset({"#div/0!", "#value!", "#ref!", "#name?", "#num!", "#null!", "#error!", "#getting_data"})
_LONGEST = 80


@dataclass(frozen=True, slots=True)
class Figure:
    """A figure taken apart.

    Attributes:
        text: the figure as it was written, without its unit.
        number: the same with a point as decimal sign and nothing else, for float() and Fraction().
        qualifier: "<", ">" or None.
        unit: the unit written behind it, or None.
        shows: the decimal sign that this figure proves, or None.
        doubtful: the sign that was read as the decimal sign and could be a thousands separator, or None.
    """

    text: str
    number: str
    qualifier: str | None = None
    unit: str | None = None
    shows: DecimalSign | None = None
    doubtful: DecimalSign | None = None


@dataclass(frozen=True, slots=True)
class NoFigure:
    """Why a cell holds no figure: the problem, what to do, and whether the cell says on purpose that there is none."""

    problem: str
    suggestion: str | None = None
    stated: bool = False


def read_figure(text: str, decimal: DecimalSign | None = None) -> Figure | NoFigure:
    """The figure in this cell.

    Args:
        text: the cell as it stands.
        decimal: the decimal sign, where the file's map says it.
    """
    stripped = text.strip().replace("\u00a0", " ").replace("\u202f", " ").replace("\u2009", " ").replace("\u2212", "-")
    if decimal != "," and PLAIN.fullmatch(stripped):
        return Figure(stripped, stripped, shows=_shown(stripped), doubtful=_doubt(stripped, decimal))
    if len(stripped) > _LONGEST:
        return NoFigure("the text is too long for a figure", "write the figure alone")
    if not stripped:
        return NoFigure("the value is empty", "write the figure, or leave the row out")
    if stripped.casefold() in _NO_FIGURE:
        return NoFigure(f"{text.strip()!r} states no figure", "this replicate would be left out", stated=True)
    if stripped.casefold() in _ERRORS:
        return NoFigure(f"{text.strip()!r} is a spreadsheet's error, not a figure", "mend the formula")
    return _taken_apart(stripped, decimal)


def _shown(plain: str) -> DecimalSign | None:
    """Whether a plain figure with a point proves that the point is the decimal sign."""
    whole, point, rest = plain.partition(".")
    return "." if point and not _could_group(whole, rest) else None


def _doubt(plain: str, decimal: DecimalSign | None) -> DecimalSign | None:
    whole, point, rest = plain.partition(".")
    return "." if decimal is None and point and _could_group(whole, rest) else None


def _could_group(whole: str, rest: str) -> bool:
    """Whether "whole.rest" could be thousands: three digits behind, one to three before, the first of them no zero."""
    whole = whole.lstrip("+-")
    return len(rest) == 3 and 1 <= len(whole) <= 3 and whole[0] != "0"


def _taken_apart(text: str, decimal: DecimalSign | None) -> Figure | NoFigure:
    if text[:1] in "≤≥" or text[:2] in ("<=", ">="):
        problem = f"{text!r}: a result below or above what can be measured is written with < or >"
        return NoFigure(problem, "write <0.5 or >100")
    found = _FIGURE.fullmatch(text)
    likely = _likely_figure(text)
    if found is None or likely:
        return NoFigure(f"{text!r} is text, not a figure", likely)
    digits, exponent, unit = found["digits"].strip(), found["exponent"] or "", found["unit"]
    read = _number(digits, decimal)
    if isinstance(read, str):
        return NoFigure(f"{text!r} {read}", "write the figure with one decimal sign and no thousands separators")
    number, shows, doubtful = read
    written = text[: found.end("exponent") if exponent else found.end("digits")].rstrip()
    qualifier = found["qualifier"] or None
    return Figure(
        written, found["sign"] + number + exponent, qualifier, unit.strip() if unit else None, shows, doubtful
    )


def _number(digits: str, decimal: DecimalSign | None) -> _Number | str:
    """Digits with separators as a plain number, the sign it proves, the sign left in doubt; or what is wrong."""
    grouped = re.sub(r"(?<=\d)[' ](?=\d{3}(?!\d))", "", digits)
    if " " in grouped or "'" in grouped:
        return "is not one figure"
    points, commas = grouped.count("."), grouped.count(",")
    if points and commas:
        return _with_groups(grouped, "." if grouped.rindex(".") > grouped.rindex(",") else ",", decimal)
    if points + commas > 1:  # several groups of thousands and no decimals
        return _with_groups(grouped, "," if points else ".", decimal)
    if not points + commas:
        return grouped, None, None
    return _one_sign(grouped, "." if points else ",", decimal, spaced=grouped != digits)


def _one_sign(figure: str, sign: DecimalSign, decimal: DecimalSign | None, *, spaced: bool) -> _Number | str:
    """A figure with one point or comma in it; `spaced` when its thousands are already set apart by something else."""
    whole, _, rest = figure.partition(sign)
    could_group = _could_group(whole, rest)
    if decimal is not None and sign != decimal:
        if could_group:
            return whole + rest, None, None
        return f"has a decimal {_NAMES[sign]}, and the file's map says that decimals have a {_NAMES[decimal]}"
    if decimal is None and could_group and not spaced:
        return f"{whole}.{rest}", None, sign
    return f"{whole or '0'}.{rest or '0'}", sign, None


_NAMES = {".": "point", ",": "comma"}


def _with_groups(grouped: str, sign: DecimalSign, decimal: DecimalSign | None) -> _Number | str:
    """A figure whose other separator groups thousands, as long as the groups are groups."""
    if decimal is not None and sign != decimal:
        return f"does not fit the file's map, which says that decimals have a {_NAMES[decimal]}"
    other = "," if sign == "." else "."
    whole, _, rest = grouped.partition(sign)
    head, *groups = whole.split(other)
    if not 1 <= len(head) <= 3 or any(len(group) != 3 for group in groups) or not (rest + "0").isdigit():
        return "has separators where no thousands are"
    return f"{head}{''.join(groups)}.{rest or '0'}", sign, None


def _likely_figure(text: str) -> str | None:
    """What was probably meant by a text with letters for digits."""
    guess = text.translate(str.maketrans("OoIl|", "00111"))
    if guess != text and text[-1].isdigit() and PLAIN.fullmatch(guess):
        return f"did you mean {guess!r}?"
    return None
