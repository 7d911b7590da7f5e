"""One worksheet's XML of an XLSX workbook: how far it reaches, what is merged, how cells are shown."""

from __future__ import annotations

import re
from functools import lru_cache

from sameline.intake.sheetfacts import Attributes, SheetFacts, Span, parse, whole
from sameline.intake.tables import UnreadableError

_MOST_TEXT = 1_000_000_000  # characters that cells may share
_REFERENCE = re.compile(r"\$?([A-Z]{1,3})\$?(\d{1,7})", re.ASCII)
# A cell and a merged cell as every common writer writes them; anything else is read by an XML parser.
_CELL = re.compile(rb'<c r="([A-Z]{1,3})([1-9]\d{0,6})"(?: s="(\d{1,6})")?(?: t="(\w{1,9})")? ?/?>')
_MERGED = re.compile(rb'<mergeCell ref="([A-Z0-9:]{1,30})" ?/?>')
_ENCODING = re.compile(rb"encoding=[\"'](?!UTF-8|utf-8)")
_AFTER_NAME = (b" ", b">", b"/", b"\t", b"\n", b"\r")


def worksheet_facts(content: bytes, shown: list[int], longest: int) -> SheetFacts:
    """What a worksheet is like.

    Args:
        content: its XML.
        shown: for each cell style how it shows figures.
        longest: characters of the longest text that cells share.

    Raises:
        UnreadableError: it is damaged, or too large.
    """
    facts = SheetFacts()
    texts = _by_pattern(content, shown, facts)
    if texts is None:
        facts = SheetFacts()
        texts = _by_parser(content, shown, facts)
    if texts * longest > _MOST_TEXT:
        raise UnreadableError("a sheet holds more text than can be read", "split it into smaller files")
    return facts


def _by_pattern(content: bytes, shown: list[int], facts: SheetFacts) -> int | None:
    """The fast path: how many cells share texts; None where a cell is not written in the common way.

    It must find what `_by_parser` finds (a test compares them).
    """
    if b"<!" in content or b"\0" in content or _ENCODING.search(content[:200]) or _elements(content, b":c"):
        return None
    texts = cells = 0
    for found in _CELL.finditer(content):
        letters, digits, style, kind = found.groups()
        row, place = int(digits), _column(letters)
        if row > facts.rows or place >= facts.columns:
            facts.reach(row, place)
        if style and (how := int(style)) < len(shown) and shown[how]:
            facts.show(row, place, shown[how])
        texts += kind == b"s"
        cells += 1
    for found in _MERGED.finditer(content):
        facts.merged.extend(_span(found[1].decode()))
    same = cells == _elements(content, b"<c") and len(facts.merged) == content.count(b"mergeCell ")
    return texts if same else None


def _elements(content: bytes, name: bytes) -> int:
    return sum(content.count(name + after) for after in _AFTER_NAME)


def _by_parser(content: bytes, shown: list[int], facts: SheetFacts) -> int:
    row, place, texts = 0, -1, 0

    def start(name: str, attributes: Attributes) -> None:
        nonlocal row, place, texts
        if name == "c":
            row, place = _place(attributes.get("r", "")) or (max(row, 1), place + 1)
            facts.reach(row, place)
            style = whole(attributes.get("s"))
            if style < len(shown):
                facts.show(row, place, shown[style])
            texts += attributes.get("t") == "s"
        elif name == "row":
            row, place = whole(attributes.get("r")) or row + 1, -1
        elif name == "mergeCell":
            facts.merged.extend(_span(attributes.get("ref", "")))

    parse(content, start)
    return texts


@lru_cache(maxsize=1024)
def _column(letters: bytes) -> int:
    """The place (from 0) of a column's letters."""
    place = 0
    for letter in letters:
        place = place * 26 + letter - 64
    return place - 1


def _place(reference: str) -> tuple[int, int] | None:
    """Row (from 1) and place (from 0) of a reference such as "B7"."""
    found = _REFERENCE.fullmatch(reference)
    return (int(found[2]), _column(found[1].encode())) if found else None


def _span(reference: str) -> list[Span]:
    first, _, last = reference.partition(":")
    start, end = _place(first), _place(last)
    return [(*start, *end)] if start and end else []
