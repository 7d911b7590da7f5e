"""The look that all pictures share: ink on white, told apart by form and weight, so that grey prints say the same."""

from __future__ import annotations

from types import MappingProxyType
from typing import Any

INK = "#18222e"
MUTED = "#56616d"
HAIR = "#c4cad1"
BAND = "#f1f3f5"
STRONG = "#7d2f12"
"""For what is shown to differ; as dark as ink in grey, so form and not colour tells it."""

SMALL, TEXT, TITLE = 6.0, 6.6, 8.4
"""Sizes of type in points; nothing is smaller than `SMALL`."""

LINE_HEIGHT = 1.32
MM = 72.0 / 25.4
"""Points in a millimetre."""

NARROWEST, WIDEST = 60.0, 420.0
"""Widths in mm that a picture may have; 85 is a column of a page, 170 its text."""

MARKERS = MappingProxyType({"differs and matters": "D", "differs": "d", "equivalent": "s", "undecided": "o"})
"""Verdict -> marker; filled where a difference is shown (`FILLED`), open where none is."""

FILLED = frozenset({"differs and matters", "differs"})


def settings() -> dict[Any, Any]:
    """Settings of matplotlib under which every picture is made and written.

    Names are never read as formulas (`text.parse_math`), text in SVG stays text, and ids in SVG come from a fixed salt.
    """
    return {
        "font.family": ["DejaVu Sans"],
        "font.size": TEXT,
        "text.parse_math": False,
        "text.usetex": False,
        "text.color": INK,
        "axes.edgecolor": INK,
        "axes.labelcolor": INK,
        "axes.linewidth": 0.6,
        "axes.unicode_minus": True,
        "axes.formatter.useoffset": False,
        "axes.formatter.use_mathtext": False,
        "xtick.color": INK,
        "ytick.color": INK,
        "lines.solid_capstyle": "butt",
        "path.simplify": False,
        "text.hinting": "no_hinting",
        "figure.facecolor": "white",
        "savefig.facecolor": "white",
        "svg.fonttype": "none",
        "svg.hashsalt": "sameline",
        "svg.id": None,
    }
