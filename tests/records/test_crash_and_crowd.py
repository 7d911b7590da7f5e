"""Killed at any instant, and used by many at once: what was acknowledged is there, the rest is there whole or not."""

from __future__ import annotations

import json
import os
import random
import subprocess
import sys
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Any

import pytest
from sqlalchemy import func, select

import laboratory
from sameline.lab import Lab, open_lab
from sameline.records import scope
from sameline.records import tables as t
from sameline.records.checks import check_ledger

Ask = Callable[..., dict[str, Any]]
ACTIONS = ("log", "amend", "conclude", "take", "log", "amend", "conclude", "amend")


@contextmanager
def zygote() -> Iterator[Ask]:
    """Asks a process that forks children; see `zygote.py`."""
    script = Path(__file__).parents[1] / "zygote.py"
    one_thread = {**os.environ, "OMP_NUM_THREADS": "1", "OPENBLAS_NUM_THREADS": "1"}
    command = [sys.executable, "-W", "ignore", str(script)]
    with subprocess.Popen(command, stdin=subprocess.PIPE, stdout=subprocess.PIPE, text=True, env=one_thread) as process:

        def ask(**task: object) -> dict[str, Any]:
            process.stdin.write(json.dumps(task) + "\n")
            process.stdin.flush()
            return json.loads(process.stdout.readline())

        yield ask
        process.stdin.close()


@pytest.fixture(scope="module")
def ask() -> Iterator[Ask]:
    with zygote() as asking:
        yield asking


def crash(ask: Ask, store: str, seed: int, rows: int) -> int:
    """Kill one worker at a random instant, and look at what it leaves; how many acts it had acknowledged."""
    rng = random.Random(seed)  # noqa: S311 - chance, not secrecy
    action = ACTIONS[seed % len(ACTIONS)]
    with open_lab(store, by="ben") as lab:
        before = _counts(lab)
    answer = ask(store=store, action=action, seed=seed, rows=rows, after=rng.randint(1, 2), share=rng.uniform(0, 1.2))
    assert answer["errors"] == []
    with open_lab(store, by="ben") as lab:
        with lab.reading() as reading:
            report = check_ledger(reading.connection)
        assert [str(f) for f in report.findings] == []
        assert set(answer["acknowledged"]) <= set(range(1, report.entries + 1))
        _whole(lab, before, action, rows)
        assert lab.catch_up().behind == ()
        with lab.reading() as reading:
            assert scope.behind(reading) == []
    return len(answer["acknowledged"])


def _counts(lab: Lab) -> dict[str, int]:
    with lab.reading() as reading:
        count = select(func.count())
        tables = (t.entry, t.run, t.measurement)
        return {table.name: reading.connection.execute(count.select_from(table)).scalar_one() for table in tables}


def _whole(lab: Lab, before: dict[str, int], action: str, rows: int) -> None:
    """Each act that was not acknowledged is there whole, or not at all."""
    after = _counts(lab)
    new = [entry for entry in lab.trail() if entry.number > before["entry"]]
    size = {"log": (1, 2), "take": (rows // 10, rows)}.get(action, (0, 0))
    acts = sum(entry.act == action for entry in new)
    assert (after["run"] - before["run"], after["measurement"] - before["measurement"]) == (
        size[0] * acts,
        size[1] * acts,
    )


@pytest.fixture
def busy(new_place: Callable[[], str]) -> str:
    """A store with eight runs and one comparison."""
    place = new_place()
    with laboratory.bare(place) as lab:
        lab.compare(laboratory.statement("batches"))
        lab.record([laboratory.run(f"B{1 + i % 4}", 1 + i, f"{70 + i % 4}.0", "70.5") for i in range(8)])
    return place


def test_killed_at_any_instant(ask: Ask, busy: str):
    acknowledged = sum(crash(ask, busy, seed, rows=500) for seed in range(12))
    assert acknowledged >= 12
    with open_lab(busy) as lab:
        assert lab.verify().findings == ()


@pytest.mark.slow
@pytest.mark.parametrize("part", range(8))
def test_killed_at_three_hundred_instants(ask: Ask, busy: str, part: int):
    acknowledged = sum(crash(ask, busy, 1000 + 20 * part + seed, rows=10_000) for seed in range(20))
    print(f"20 kills, {acknowledged} acts acknowledged")
    with open_lab(busy) as lab:
        assert lab.verify().findings == ()


def crowded(ask: Ask, store: str, runs: int) -> None:
    with open_lab(store) as lab:
        before = _counts(lab)
    said = ask(store=store, action="crowd", processes=8, runs=runs)["said"]
    assert [line for line in said if not line.startswith("done")] == []
    assert len({line.split()[1] for line in said}) == 8 * runs
    assert {line.split()[2] for line in said} == {"0"}
    with open_lab(store) as lab:
        after = _counts(lab)
        assert after["run"] - before["run"] == 8 * runs
        assert after["measurement"] - before["measurement"] == 16 * runs
        found = lab.verify()
        assert (found.findings, found.behind) == ((), ())
        assert found.ledger.entries == after["entry"]
        per_session = lab.measurements()["session"].value_counts()
        assert [per_session[f"p{number}"] for number in range(8)] == [2 * runs] * 8


def test_a_crowd(ask: Ask, busy: str):
    crowded(ask, busy, runs=3)


@pytest.mark.slow
def test_a_crowd_of_eight_hundred_runs(ask: Ask, busy: str):
    crowded(ask, busy, runs=100)


def _fail_at_the_end(lab: Lab) -> None:
    with lab._act("log", None) as act:
        act.add(t.supplier, code="GONE")
        act.record()
        raise ZeroDivisionError


def test_an_act_that_raises_leaves_nothing(store: str):
    with open_lab(store, by="ana") as lab:
        before = lab.verify().ledger
        with pytest.raises(ZeroDivisionError):
            _fail_at_the_end(lab)
    with open_lab(store, by="ana") as lab:
        assert lab.verify().ledger == before
        assert lab.record([laboratory.run("B1", 20, "70.0")]).entry == before.entries + 1
