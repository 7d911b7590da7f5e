"""A small laboratory with a fixed clock, whose texts are compared with files."""

from __future__ import annotations

import contextlib
import datetime as dt
import io
import itertools
import re
from collections.abc import Iterator
from dataclasses import replace
from pathlib import Path

import pytest
from hypothesis import settings

from sameline.cli import run
from sameline.conclusions.statements import settled
from sameline.lab import Lab, make_lab
from sameline.records.comparisons import Statement
from sameline.records.moments import utc_text

settings.register_profile("fixed", deadline=None, derandomize=True)
settings.load_profile("fixed")

HEADINGS = "batch,characteristic,tested_at,analyst,instrument,session,replicate,value"
FIRST = """
L-11,TS,2026-02-03T09:00,ilse,RIG-1,S1,1,21.4
L-11,TS,2026-02-03T09:00,ilse,RIG-1,S1,2,21.1
L-12,TS,2026-02-03T09:20,ilse,RIG-1,S1,1,21.9
L-12,TS,2026-02-03T09:20,ilse,RIG-1,S1,2,22.3
L-13,TS,2026-02-03T09:40,ilse,RIG-1,S1,1,27.8
L-13,TS,2026-02-03T09:40,ilse,RIG-1,S1,2,28.2
L-11,TS,2026-02-10T09:00,odo,RIG-1,S2,1,22.0
L-11,TS,2026-02-10T09:00,odo,RIG-1,S2,2,21.8
L-12,TS,2026-02-10T09:20,odo,RIG-1,S2,1,22.6
L-12,TS,2026-02-10T09:20,odo,RIG-1,S2,2,22.4
L-13,TS,2026-02-10T09:40,odo,RIG-1,S2,1,28.9
L-13,TS,2026-02-10T09:40,odo,RIG-1,S2,2,28.6
"""
SECOND = """
L-11,TS,2026-02-17T09:00,ilse,RIG-1,S3,1,21.2
L-11,TS,2026-02-17T09:00,ilse,RIG-1,S3,2,21.5
L-12,TS,2026-02-17T09:20,ilse,RIG-1,S3,1,22.1
L-12,TS,2026-02-17T09:20,ilse,RIG-1,S3,2,19.8
L-13,TS,2026-02-17T09:40,ilse,RIG-1,S3,1,82.3
L-13,TS,2026-02-17T09:40,ilse,RIG-1,S3,2,28.0
"""


COMMANDS = {
    "differ": ("differ", "strength"),
    "differ-first-answer": ("differ", "strength", "--version", "2", "--all"),
    "differ-over-all-looks": ("differ", "strength, open", "--all"),
    "differ-overview": ("differ",),
    "history": ("history", "strength, open"),
    "trail": ("trail",),
    "trail-of-a-batch": ("trail", "--batch", "L-13"),
    "verify": ("verify",),
    "runs": ("runs", "--characteristic", "TS"),
    "list": ("list", "characteristic"),
}
"""The commands whose output is kept in `expected/`."""


def made(folder: Path) -> Lab:
    """Three batches, two files, a slip and its amendment, a run set aside, and a question restated."""
    start = dt.datetime(2026, 3, 2, 7, 30, tzinfo=dt.UTC)
    minutes = itertools.count()

    def clock() -> str:
        return utc_text(start + dt.timedelta(minutes=next(minutes)))

    lab = make_lab(
        folder / "lab.db", by="ilse", person_name="Ilse Marran", role="analyst", name="Ferrin Seals", clock=clock
    )
    lab.add("person", "odo", name="Odo Kettel", role="quality engineer")
    lab.add("supplier", "LYS", name="Lysander Compounds")
    lab.add("material", "FKM-75", name="Fluoro-rubber 75")
    lab.add("instrument", "RIG-1", name="Tensile rig")
    lab.add(
        "characteristic", "TS", name="Tensile strength", method="ISO 37, type 2", unit="MPa", lower=20.0, margin=2.0,
        decimals=1, safety_critical=1,
    )  # fmt: skip
    for code in ("L-11", "L-12", "L-13"):
        lab.add("batch", code, material="FKM-75", supplier="LYS", received="2026-02-01")
    lab.acting("odo")
    once = Statement(
        name="strength", characteristic="TS", grouping="batch", groups=("L-11", "L-12", "L-13"),
        looks="single", final_units=6,
    )  # fmt: skip
    always = Statement(name="strength, open", characteristic="TS", grouping="batch", of_supplier="LYS")
    for statement in (once, always):
        lab.compare(settled(statement, model=None, procedure=None))
    lab.acting("ilse")
    for name, rows in {"early.csv": FIRST, "late.csv": SECOND}.items():
        (folder / name).write_text(HEADINGS + rows, encoding="utf-8")
        lab.take([folder / name], as_they_stand=True)
    slip = lab.find_run("L-13", "TS", "2026-02-17T09:40")
    lab.amend(*lab.corrected(slip, 1, "28.3"), reason="digits swapped when typing; the rig's print-out says 28.3")
    lab.exclude("specimen damaged", reason="nick at the grip", run=lab.find_run("L-12", "TS", "2026-02-17T09:20"))
    lab.acting("odo")
    stricter = replace(once, alpha=0.01)
    lab.compare(settled(stricter, model=None, procedure=None), reason="a stricter rate was agreed with purchasing")
    return lab


def texts(folder: Path) -> dict[str, str]:
    """What the commands write of this laboratory, by the name of the file that it is compared with."""
    made(folder).close()
    return {name: _text(*arguments, "--store", str(folder / "lab.db")) for name, arguments in COMMANDS.items()}


def _text(*arguments: str) -> str:
    out = io.StringIO()
    with contextlib.redirect_stdout(out):
        assert run([*arguments]) == 0
    # the root depends on the versions of the libraries, which the conclusions record
    return re.sub(r"(?<=root of the ledger: )[0-9a-f]{64}", "(64 hexadecimal digits)", out.getvalue())


@pytest.fixture(scope="session")
def lab(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Lab]:
    with made(tmp_path_factory.mktemp("lab")) as lab:
        yield lab


@pytest.fixture(scope="session")
def written(tmp_path_factory: pytest.TempPathFactory) -> dict[str, str]:
    return texts(tmp_path_factory.mktemp("texts"))
