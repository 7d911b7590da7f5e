"""What makes an SVG stand by itself: a title and description for those who listen, and the typeface it is set in."""

from __future__ import annotations

import base64
import hashlib
import io
import re
from functools import lru_cache
from html import unescape
from pathlib import Path
from xml.sax.saxutils import escape

_TEXT = re.compile(r"<text[^>]*>(.*?)</text>", re.DOTALL)
_FACES = (("normal", "DejaVuSans.ttf"), ("bold", "DejaVuSans-Bold.ttf"))


def finished(raw: bytes, title: str, description: str) -> bytes:
    """An SVG as matplotlib writes it, made to stand by itself.

    Args:
        raw: the SVG.
        title: plain text.
        description: plain text.
    """
    svg = raw.decode("utf-8")
    shown = frozenset(c for text in _TEXT.findall(svg) for c in unescape(text) if c.isprintable())
    mark = hashlib.sha256(raw).hexdigest()[:8]
    inside = (
        f'\n <title id="title-{mark}">{escape(title)}</title>'
        f'\n <desc id="description-{mark}">{escape(description)}</desc>'
        f'\n <style type="text/css">{_faces(shown)}</style>'
    )
    start = svg.index(">", svg.index("<svg ")) + 1
    head = svg[: start - 1] + f' role="img" aria-labelledby="title-{mark} description-{mark}">'
    return (head + inside + svg[start:]).encode("utf-8")


def _faces(characters: frozenset[str]) -> str:
    return "".join(
        f"@font-face{{font-family:'DejaVu Sans';font-weight:{weight};"
        f"src:url(data:font/ttf;base64,{base64.b64encode(_subset(name, characters)).decode('ascii')})}}"
        for weight, name in _FACES
    )


@lru_cache(maxsize=64)
def _subset(name: str, characters: frozenset[str]) -> bytes:
    """The typeface with these characters only, the same bytes each time."""
    import matplotlib as mpl
    from fontTools import subset
    from fontTools.ttLib import TTFont

    options = subset.Options(hinting=False, layout_features=[], name_IDs=[1, 2], notdef_outline=True)
    options.drop_tables += ["GSUB", "GPOS", "GDEF", "kern", "FFTM"]
    with TTFont(Path(mpl.get_data_path()) / "fonts" / "ttf" / name, recalcTimestamp=False, lazy=True) as font:
        worker = subset.Subsetter(options)
        worker.populate(unicodes=sorted(ord(c) for c in characters))
        worker.subset(font)
        out = io.BytesIO()
        font.save(out)
    return out.getvalue()
