"""What an XLSX workbook says of its sheets (ECMA-376 part 1): extent, merged cells, how figures are shown."""

from __future__ import annotations

import posixpath
import re

from sameline.intake.packed import Packed
from sameline.intake.sheetfacts import PERCENT, Attributes, SheetFacts, parse, whole
from sameline.intake.worksheets import worksheet_facts


def xlsx_facts(packed: Packed) -> dict[str, SheetFacts]:
    """The worksheets of an XLSX workbook by name.

    Raises:
        UnreadableError: it is damaged, or a sheet is too large.
    """
    longest = _longest_text(packed)
    shown = _shown_by_style(packed)
    return {name: worksheet_facts(packed.read(part), shown, longest) for name, part in _worksheets(packed).items()}


def _worksheets(packed: Packed) -> dict[str, str]:
    """Sheet names and the parts of the package that hold them."""
    targets: dict[str, str] = {}
    sheets: dict[str, str] = {}

    def relation(name: str, attributes: Attributes) -> None:
        if name == "Relationship" and attributes.get("Type", "").endswith("/worksheet"):
            target = attributes.get("Target", "")
            part = target.lstrip("/") if target.startswith("/") else posixpath.normpath(f"xl/{target}")
            targets[attributes.get("Id", "")] = part

    def sheet(name: str, attributes: Attributes) -> None:
        if name == "sheet":
            identity = next((value for key, value in attributes.items() if key.endswith(" id")), "")
            if identity in targets:
                sheets[attributes.get("name", "")] = targets[identity]

    parse(packed.read("xl/_rels/workbook.xml.rels"), relation)
    parse(packed.read("xl/workbook.xml"), sheet)
    return sheets


def _longest_text(packed: Packed) -> int:
    """Characters of the longest text that cells share."""
    if "xl/sharedStrings.xml" not in packed.names:
        return 0
    longest = present = 0

    def start(name: str, _attributes: Attributes) -> None:
        nonlocal present
        if name == "si":
            present = 0

    def text(piece: str) -> None:
        nonlocal longest, present
        present += len(piece)
        longest = max(longest, present)

    parse(packed.read("xl/sharedStrings.xml"), start, text)
    return longest


def _shown_by_style(packed: Packed) -> list[int]:
    """For each cell style how it shows figures."""
    if "xl/styles.xml" not in packed.names:
        return []
    codes = {9: "0%", 10: "0.00%", 2: "0.00", 4: "0.00", 39: "0.00", 40: "0.00"}  # ECMA-376 part 1, 18.8.30
    styles: list[int] = []
    inside = False

    def start(name: str, attributes: Attributes) -> None:
        nonlocal inside
        if name == "numFmt":
            codes[whole(attributes.get("numFmtId"))] = attributes.get("formatCode", "")
        elif name in ("cellXfs", "cellStyleXfs", "cellStyles", "dxfs"):
            inside = name == "cellXfs"
        elif name == "xf" and inside:
            styles.append(whole(attributes.get("numFmtId")))

    parse(packed.read("xl/styles.xml"), start)
    return [shown_by(codes.get(style, "")) for style in styles]


def shown_by(code: str) -> int:
    """The decimals that a number format always shows, plus `PERCENT` where it shows percentages."""
    plain = re.sub(r'"[^"]*"|\\.|\[[^\]]*\]|_.|\*.', "", code).partition(";")[0]
    if re.search(r"[EeYyDdHhSs?/]", plain):
        return 0
    decimals = re.search(r"\.(0+)", plain)
    return min(len(decimals[1]) if decimals else 0, 30) + (PERCENT if "%" in plain else 0)
