"""Mutated files: no traceback, no run twice, nothing taken that is not as it should be; fixed seeds."""

from __future__ import annotations

import contextlib
import io
import random
import zipfile
from collections.abc import Callable
from math import isfinite

import openpyxl
import pandas as pd
import pytest

from sameline.errors import CallError
from sameline.intake.files import Intake, read_files
from sameline.intake.headings import HeadingMap, MapColumn
from sameline.intake.marked import marked_copy
from sameline.intake.proposals import propose_map
from sameline.intake.rawfiles import RawFile
from sameline.intake.rest import rest_files
from sameline.records.drafts import Register

HEAD = [
    "batch",
    "characteristic",
    "tested_at",
    "analyst",
    "instrument",
    "session",
    "replicate",
    "value",
    "unit",
    "note",
]
ROWS = [
    ["B-117", "TS", f"2026-03-0{day}T08:30", "ana", "RIG-1", "week 10", str(number), f"{12 + number / 10}", "", ""]
    for day in (4, 5)
    for number in (1, 2, 3)
]
ROWS.append(["B-121", "SET", "2026-03-06", "", "", "", "1", "<0.5", "%", "it, too"])
ROWS.append(["B-130", "HA", "2026-03-06", "", "", "", "1", "60", "", ""])
MAPS = [
    HeadingMap(
        "rig",
        (
            MapColumn("Lot", "batch"),
            MapColumn("Date", "tested_at"),
            MapColumn("Time", "time"),
            *(MapColumn(f"TS {number} [psi]", "value", "TS", "psi", number) for number in (1, 2, 3)),
        ),
        date_order="dmy",
        decimal=",",
        encoding="cp1252",
        fill_down=("batch",),
        footers=("Mean",),
    )
]
WIDE = (
    "Bericht für;;;;;\nLot;Date;Time;TS 1 [psi];TS 2 [psi];TS 3 [psi]\n"
    "B-117;04.03.2026;08:30;1813,5;1.820,25;1800\n;05.03.2026;08:30;1813;n/a;1799,5\nMean;;;1810;1811;1812\n"
)
TOKENS = [
    *(b",", b";", b"\t", b'"', b"\n", b"\r", b"\0", b"-", b"<", b">", b"%", b"n/a", b"nan", b"Mean", b"A0"),
    *(b"\xff\xfe", b"\xef\xbb\xbf", b"\xb2", b"\xe2\x80\xae", b"\xcc\x81" * 40),
    *(b"1e999", b"=1+1", b"1,234", b"999999999999999999999", b"12 psi", b"5 parsec", b"B-1l7", b"replicate 7"),
    *(b"03/04/26", b"9999-12-31", b"0001-01-01", b"2026-10-25T02:30"),
    *(b"&lt;", b"]]>", b"<!--", b"XFD1048576", b"1048576"),
]


def as_csv(rows: list[list[str]], delimiter: str = ",") -> str:
    return pd.DataFrame(rows[1:], columns=rows[0]).to_csv(index=False, sep=delimiter)


def as_xlsx() -> bytes:
    book = openpyxl.Workbook()
    for row in (HEAD, *ROWS):
        book.worksheets[0].append([float(cell) if cell.replace(".", "", 1).isdigit() else cell or None for cell in row])
    book.worksheets[0].merge_cells("A2:A4")
    book.worksheets[0]["H2"].number_format = "0.00"
    book.create_sheet("Notes").append(["nothing"])
    stream = io.BytesIO()
    book.save(stream)
    return stream.getvalue()


def as_ods() -> bytes:
    stream = io.BytesIO()
    pd.DataFrame(ROWS, columns=HEAD).to_excel(stream, engine="odf", index=False)
    return stream.getvalue()


def bases() -> list[bytes]:
    tidy = as_csv([HEAD, *ROWS])
    return [
        tidy.encode(),
        as_csv([HEAD, *ROWS], ";").replace(".", ",").encode("utf-8-sig"),
        as_csv([HEAD, *ROWS], "\t").encode("utf-16"),
        WIDE.encode("cp1252"),
        as_xlsx(),
        as_ods(),
    ]


def mutated(data: bytes, chance: random.Random) -> bytes:
    """One to four changes of bytes, cells, rows or lengths."""
    piece = bytearray(data)
    for _ in range(chance.randint(1, 4)):
        place, length = chance.randrange(len(piece) + 1), chance.randint(1, 30)
        change = chance.randrange(7)
        if change == 0 and piece:
            piece[place % len(piece)] = chance.randrange(256)
        elif change == 1:
            del piece[place : place + length]
        elif change == 2:
            piece[place:place] = piece[place : place + length]
        elif change == 3:
            piece[place:place] = chance.choice(TOKENS)
        elif change == 4:
            piece[place : place + length] = chance.choice(TOKENS)
        elif change == 5:
            lines = bytes(piece).split(b"\n")
            chance.shuffle(lines)
            piece = bytearray(b"\n".join(lines))
        else:
            del piece[place:]
    return bytes(piece)


def mutated_inside(data: bytes, chance: random.Random) -> bytes:
    """A workbook with one part mutated and packed anew, so that the damage reaches the readers of its parts."""
    with zipfile.ZipFile(io.BytesIO(data)) as old:
        parts = {name: old.read(name) for name in old.namelist()}
    name = chance.choice(sorted(parts))
    parts[name] = mutated(parts[name], chance)
    stream = io.BytesIO()
    with zipfile.ZipFile(stream, "w", zipfile.ZIP_DEFLATED) as new:
        for part, content in parts.items():
            new.writestr(part, content)
    return stream.getvalue()


def check(intake: Intake, register: Register) -> None:
    seen = set()
    for run in intake.runs:
        identity = (run.batch, run.characteristic, run.tested_at, run.analyst, run.instrument, run.session)
        assert identity not in seen
        seen.add(identity)
        assert run.batch in register.batches
        assert run.characteristic in register.characteristics
        assert run.analyst is None or run.analyst in register.people
        assert run.instrument is None or run.instrument in register.instruments
        assert run.tested_at <= register.now
        assert run.measurements
        numbers = [measurement.replicate for measurement in run.measurements]
        assert numbers == sorted(set(numbers))
        assert numbers[0] >= 1
        assert all(isfinite(m.value) and m.qualifier in (None, "<", ">") and m.text.strip() for m in run.measurements)
    for part in intake.parts:
        assert part.held is None or not {run.row for run in part.runs} & set(part.held)
    assert all(str(finding) and finding.problem for finding in intake.findings)
    assert intake.runs or intake.findings


def soak(register: Register, count: int, first: int) -> dict[str, int]:
    """Mutate, read and check `count` files; how many were taken whole, asked about and refused."""
    originals = bases()
    outcome = {"taken": 0, "asked": 0, "refused": 0}
    for seed in range(first, first + count):
        chance = random.Random(seed)  # noqa: S311 - a fixed seed is what is wanted
        data = chance.choice(originals)
        inside = data.startswith(b"PK") and chance.random() < 0.8
        raw = RawFile("fuzzed", mutated_inside(data, chance) if inside else mutated(data, chance))
        intake = read_files([raw], register, maps=MAPS, limit=5_000_000)
        check(intake, register)
        outcome["refused" if intake.refusals else "asked" if intake.questions else "taken"] += 1
        if seed % 5 == 0:
            lesser(raw, intake, register)
    return outcome


def lesser(raw: RawFile, intake: Intake, register: Register) -> None:
    """What else is done with a file refuses it only in so many words."""
    with contextlib.suppress(CallError):
        propose_map(raw, register)
    with contextlib.suppress(CallError):
        marked_copy(raw, intake)
    with contextlib.suppress(CallError):
        for rest in rest_files(raw, intake, MAPS):
            check(read_files([rest], register, maps=MAPS), register)


@pytest.mark.parametrize("number", range(6))
def test_the_originals_are_taken_without_a_refusal(register: Register, number: int):
    intake = read_files([RawFile("original", bases()[number])], register, maps=MAPS)
    check(intake, register)
    assert intake.refusals == ()
    assert len(intake.runs) >= 2


def test_three_hundred_mutated_files(register: Register):
    outcome = soak(register, 300, first=0)
    assert outcome["refused"] > 100
    assert outcome["taken"] > 0


@pytest.mark.slow
def test_five_thousand_mutated_files(register: Register):
    outcome = soak(register, 5_000, first=1_000)
    assert min(outcome.values()) > 0


@pytest.mark.parametrize("part", [as_csv([HEAD, *ROWS]).encode(), WIDE.encode("cp1252")])
def test_every_beginning_of_a_file_is_read_or_refused(register: Register, part: bytes):
    reading: Callable[[bytes], Intake] = lambda data: read_files([RawFile("cut", data)], register, maps=MAPS)  # noqa: E731
    for length in range(len(part)):
        check(reading(part[:length]), register)
