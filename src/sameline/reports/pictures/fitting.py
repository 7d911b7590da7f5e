"""Text made to fit: its width, its lines, and names shortened so that no two become the same."""

from __future__ import annotations

import unicodedata
from collections.abc import Sequence
from functools import lru_cache

from sameline.reports.pictures.style import MM

_UNSAFE = frozenset({"Cc", "Cs", "Co", "Cn", "Zl", "Zp"})
_TURNING = frozenset("\u200e\u200f\u202a\u202b\u202c\u202d\u202e\u2066\u2067\u2068\u2069\ufeff")
ELLIPSIS = "…"


def safe(text: str) -> str:
    """A text that may stand in a picture: characters that no XML may hold, or that turn the reading, are shown as �."""
    spaced = " ".join(text.split())
    return "".join("\ufffd" if unicodedata.category(c) in _UNSAFE or c in _TURNING else c for c in spaced)


@lru_cache(maxsize=4096)
def width_of(text: str, size: float, *, bold: bool = False) -> float:
    """Width of a line of text in mm, as matplotlib sets it in DejaVu Sans of so many points."""
    from matplotlib.font_manager import FontProperties
    from matplotlib.textpath import text_to_path

    face = FontProperties(family="DejaVu Sans", size=size, weight="bold" if bold else "normal")
    wide, _, _ = text_to_path.get_text_width_height_descent(text or " ", face, ismath=False)
    return float(wide) / MM


def wrapped(text: str, width: float, size: float) -> list[str]:
    """A text in lines of at most `width` mm; words that are longer than a line are broken."""
    lines: list[str] = []
    line = ""
    for word in _short_words(text, width, size):
        longer = f"{line} {word}" if line else word
        if not line or width_of(longer, size) <= width:
            line = longer
        else:
            lines.append(line)
            line = word
    return [*lines, line] if line else lines


def _short_words(text: str, width: float, size: float) -> list[str]:
    words: list[str] = []
    for word in text.split():
        rest = word
        while width_of(rest, size) > width and len(rest) > 1:
            cut = _longest(rest, width, size)
            words.append(rest[:cut])
            rest = rest[cut:]
        words.append(rest)
    return words


def _longest(text: str, width: float, size: float) -> int:
    """How many characters fit, at least 1."""
    low, high = 1, len(text)
    while low < high:
        middle = (low + high + 1) // 2
        low, high = (middle, high) if width_of(text[:middle], size) <= width else (low, middle - 1)
    return low


def shortened(names: Sequence[str], width: float, size: float) -> list[str]:
    """Names of at most `width` mm: the middle of a longer one is left out; where two would be the same, a number tells.

    Args:
        names: different names.
        width: in mm.
        size: of type, in points.
    """
    short = [_elided(name, width, size) for name in names]
    if len(set(short)) == len(set(names)):
        return short
    places = {name: place for place, name in enumerate(dict.fromkeys(names), 1)}
    return [
        text if short.count(text) == 1 else f"{places[name]}:{_elided(name, width - width_of('00:', size), size)}"
        for name, text in zip(names, short, strict=True)
    ]


def _elided(name: str, width: float, size: float) -> str:
    if width_of(name, size) <= width:
        return name
    for kept in range(len(name) - 1, 1, -1):
        tail = kept // 2
        text = name[: kept - tail].rstrip() + ELLIPSIS + name[len(name) - tail :].lstrip()
        if width_of(text, size) <= width:
            return text
    return ELLIPSIS
