"""How fast a million tidy rows are read and checked, beside peers that check nothing, in the same run.

Run it with `python tests/intake/benchmark_reading.py [ROWS]`. Peers: the csv module alone; csv with float() and a
dictionary of runs; pandas.read_csv with a groupby.
"""

from __future__ import annotations

import csv
import io
import random
import sys
import time
from collections.abc import Callable

import pandas as pd

from sameline.intake.files import Intake, read_files
from sameline.intake.rawfiles import RawFile
from sameline.records.drafts import CharacteristicFacts, Register

REPLICATES = 10
BATCHES = [f"B-{number:05d}" for number in range(2_000)]
HEAD = "batch,characteristic,tested_at,analyst,instrument,session,replicate,value"
REGISTER = Register(
    dict.fromkeys(BATCHES, "M"),
    {"TS": CharacteristicFacts("TS", "MPa", mean=12.5, spread=0.3, decimals=2)},
    frozenset({"ana"}),
    frozenset({"RIG-1"}),
    "UTC",
    "2026-12-01T00:00:00.000000Z",
)


def make(rows: int, decimals: int) -> bytes:
    chance = random.Random(1)  # noqa: S311 - a fixed seed is what is wanted
    lines = [HEAD]
    for run in range(rows // REPLICATES):
        tested = (
            f"2025-{chance.randint(1, 12):02d}-{chance.randint(1, 28):02d}T{run % 24:02d}:{run % 60:02d}:{run % 59:02d}"
        )
        start = f"{chance.choice(BATCHES)},TS,{tested},ana,RIG-1,S{run}"
        lines.extend(f"{start},{number},{chance.gauss(12.5, 0.3):.{decimals}f}" for number in range(1, REPLICATES + 1))
    return "\n".join(lines).encode()


def csv_alone(data: bytes) -> None:
    for _ in csv.reader(io.TextIOWrapper(io.BytesIO(data), encoding="utf-8", newline="")):
        pass


def csv_and_runs(data: bytes) -> None:
    reader = csv.reader(io.TextIOWrapper(io.BytesIO(data), encoding="utf-8", newline=""))
    next(reader)
    runs: dict[tuple[str, ...], list[tuple[int, str, float]]] = {}
    for row in reader:
        runs.setdefault(tuple(row[:6]), []).append((int(row[6]), row[7], float(row[7])))


def by_pandas(data: bytes) -> None:
    frame = pd.read_csv(io.BytesIO(data), dtype={"session": str})
    frame["tested_at"] = pd.to_datetime(frame["tested_at"])
    frame.groupby(HEAD.split(",")[:6], sort=False)["value"].count()


def ours(data: bytes) -> Intake:
    return read_files([RawFile("bench.csv", data)], REGISTER)


def timed(work: Callable[[bytes], object], data: bytes) -> float:
    best = float("inf")
    for _ in range(3):
        start = time.process_time()
        work(data)
        best = min(best, time.process_time() - start)
    return best


def main() -> None:
    rows = int(sys.argv[1]) if len(sys.argv) > 1 else 1_000_000
    for decimals in (2, 9):
        data = make(rows, decimals)
        intake = ours(data)
        if len(intake.runs) != rows // REPLICATES or intake.refusals:
            raise SystemExit("the benchmark's file was not taken whole")
        mine = timed(ours, data)
        print(f"{rows} rows ({decimals} decimals, {len(data) / 1e6:.0f} MB): {rows / mine:,.0f} rows/s, all checks")
        for peer in (csv_alone, csv_and_runs, by_pandas):
            theirs = timed(peer, data)
            print(f"  {mine / theirs:.1f} times the time of {peer.__name__} ({rows / theirs:,.0f} rows/s)")


if __name__ == "__main__":
    main()
