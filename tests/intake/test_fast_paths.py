"""The fast path through a table gives what the slow, literal one gives."""

from __future__ import annotations

import csv
import io
import random
from collections.abc import Callable
from decimal import Decimal

import pytest

from sameline.intake import gather
from sameline.intake.files import Intake
from sameline.records.drafts import DraftMeasurement, DraftRun, Register
from sameline.records.moments import read_moment

Take = Callable[..., Intake]
HEAD = "batch,characteristic,tested_at,analyst,instrument,session,replicate,value\n"


def messy(seed: int, unit: str = "") -> str:
    """A tidy file with most of what can be right or wrong in it."""
    chance = random.Random(seed)  # noqa: S311 - a fixed seed is what is wanted
    lines = []
    for _ in range(chance.randint(1, 40)):
        batch, characteristic = chance.choice(["B-117", "B-121", "B-1l7"]), chance.choice(["TS", "TS", "HA", "SET"])
        tested = f"2026-{chance.randint(1, 12):02d}-{chance.randint(1, 28):02d}T{chance.randint(0, 23):02d}:30"
        session = chance.choice(["", "week 10"])
        for number in range(1, chance.randint(1, 30)):
            value = f"{chance.gauss(12.5, 0.3):.{chance.randint(0, 9)}f}"
            value = chance.choice(
                [value] * 30 + ["125", "n/a", "", "x", "<1", "1.234", "12,5", "1e3", " 12.5 ", "12 MPa", "1,234"]
            )
            stated = chance.choice([str(number)] * 30 + ["", str(number + 1), "0", " 2 "])
            lines.append(f'{batch},{characteristic},{tested},,,{session},{stated},"{value}"\n')
    if chance.random() < 0.3:
        chance.shuffle(lines)
    return HEAD.replace("value", f"value{unit}") + "".join(lines)


@pytest.mark.parametrize("unit", ["", " [MPa]", " (psi)"])
def test_the_fast_path_finds_and_takes_what_the_slow_one_does(take: Take, monkeypatch: pytest.MonkeyPatch, unit: str):
    for seed in range(12):
        text = messy(seed, unit)
        fast = take(text)
        with monkeypatch.context() as patched:
            patched.setattr(gather, "CACHED", 0)
            slow = take(text)
        assert fast == slow


def literally(text: str, zone: str) -> list[DraftRun]:
    """The definition: rows that agree in six columns are a run, in the order in which they begin."""
    runs: dict[tuple[str, ...], list[tuple[int, dict[str, str]]]] = {}
    for number, row in enumerate(csv.DictReader(io.StringIO(text)), 2):
        key = tuple(row[name] for name in ("batch", "characteristic", "tested_at", "analyst", "instrument", "session"))
        runs.setdefault(key, []).append((number, row))
    return [
        DraftRun(
            batch=key[0],
            characteristic=key[1],
            tested_at=read_moment(key[2], zone),
            measurements=tuple(
                DraftMeasurement(int(row["replicate"]), row["value"], float(Decimal(row["value"])))
                for _, row in sorted(rows, key=lambda row: int(row[1]["replicate"]))
            ),
            analyst=key[3] or None,
            instrument=key[4] or None,
            session=key[5] or None,
            row=rows[0][0],
        )
        for key, rows in runs.items()
    ]


def test_clean_files_are_read_as_the_definition_says(take: Take, register: Register):
    for seed in range(20):
        chance = random.Random(seed)  # noqa: S311 - a fixed seed is what is wanted
        lines = []
        for run in range(30):
            start = f"B-117,HA,2026-0{run % 9 + 1}-1{run % 10}T08:{run % 60:02d},ana,,s{run}"
            figures = [f"{chance.gauss(60, 2):.{run % 8}f}" for _ in range(chance.randint(1, 40))]
            lines.extend(f"{start},{number},{figure}\n" for number, figure in enumerate(figures, 1))
        chance.shuffle(lines)
        text = HEAD + "".join(lines)
        intake = take(text)
        assert intake.refusals == ()
        assert list(intake.runs) == literally(text, register.zone)
