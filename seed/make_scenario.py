"""Make the demo scenario: raw run files and the list of what the tour does, from the story in story.toml.

Everything in it is invented. The same story gives the same bytes on every machine: each figure is drawn from a PCG64
stream of its own, named by what it belongs to, and rounded to the decimals its characteristic is reported with.

    python seed/make_scenario.py            # writes runs/*.csv and scenario.json beside this script
    python seed/make_scenario.py FOLDER     # writes them there
"""

from __future__ import annotations

import csv
import hashlib
import io
import json
import sys
import tomllib
from dataclasses import dataclass, field
from pathlib import Path
from statistics import NormalDist
from typing import TYPE_CHECKING, Any

import numpy as np

if TYPE_CHECKING:
    from collections.abc import Iterator, Sequence

HERE = Path(__file__).parent
COLUMNS = ("batch", "characteristic", "tested_at", "analyst", "instrument", "session", "replicate", "value")
ANALYSTS = ("tellinde", "vashkiri")
INSTRUMENTS = {"CS": ("OVEN-1", "OVEN-2"), "HARD": ("DURO-1", "DURO-1"), "TS": ("RIG-1", "RIG-1")}
MORNING = {"CS": 8 * 60 + 30, "HARD": 10 * 60 + 15, "TS": 11 * 60 + 20}  # minutes after midnight
AFTERNOON = 5 * 60  # later by that much, the second run of a day
SPACING = 10  # minutes between the batches of one day
ZONE = "+01:00"

Json = dict[str, Any]


@dataclass(frozen=True, slots=True)
class Truth:
    """What is true of the batches of one question; means, shifts and standard deviations in its unit."""

    characteristic: str
    seed: int
    mean: float
    batch_sd: float
    session_sd: float
    run_sd: float
    replicate_sd: float
    shift: dict[str, float] = field(default_factory=dict)


@dataclass(frozen=True, slots=True)
class Run:
    """One run as it is written to a file: the values are text, as a person or an instrument would record them."""

    batch: str
    characteristic: str
    tested_at: str
    analyst: str
    instrument: str
    session: str
    values: tuple[str, ...]

    def rows(self) -> Iterator[tuple[str, ...]]:
        """One row a replicate, in the order of COLUMNS."""
        head = (self.batch, self.characteristic, self.tested_at, self.analyst, self.instrument, self.session)
        for number, value in enumerate(self.values, start=1):
            yield (*head, str(number), value)


@dataclass(frozen=True, slots=True)
class Slip:
    """A figure typed wrong: what should have been recorded, and what was."""

    run: Run
    replicate: int
    meant: str
    typed: str


def normals(seed: int, *name: str) -> Iterator[float]:
    """Standard normal draws of the stream that belongs to this name.

    Raw PCG64 output through the inverse normal distribution: numpy promises the stream of its bit generators, not
    that of its distributions.
    """
    key = hashlib.sha256("|".join((str(seed), *name)).encode()).digest()
    bits = np.random.PCG64(np.random.SeedSequence(int.from_bytes(key, "big")))
    inverse = NormalDist().inv_cdf
    while True:
        yield inverse(((bits.random_raw() >> 12) + 0.5) * 2.0**-52)


class World:
    """The invented plant: knows the truth and what a test of a batch on a day would record."""

    def __init__(self, story: Json) -> None:
        self.truths = {name: Truth(**truth) for name, truth in story["truth"].items()}
        self.session_seed: int = story["session_seed"]
        self.decimals: dict[str, int] = {
            item["code"]: item["decimals"] for step in story["step"] for item in step.get("characteristics", ())
        }

    def values(self, question: str, batch: str, session: str, occasion: int, replicates: int) -> tuple[str, ...]:
        """The replicates of the run of this batch on this day (occasion 0: morning, 1: afternoon)."""
        truth = self.truths[question]
        run = normals(truth.seed, "run", batch, session, str(occasion))
        level = (
            truth.mean
            + truth.shift.get(batch, 0.0)
            + truth.batch_sd * next(normals(truth.seed, "batch", batch))
            + truth.session_sd * next(normals(self.session_seed, truth.characteristic, session))
            + truth.run_sd * next(run)
        )
        decimals = self.decimals[truth.characteristic]
        return tuple(f"{level + truth.replicate_sd * next(run):.{decimals}f}" for _ in range(replicates))


def swapped(figure: str) -> str:
    """The figure with its first two digits swapped: 18.2 becomes 81.2."""
    return figure[1] + figure[0] + figure[2:]


def session_runs(world: World, step: Json, parity: int) -> tuple[list[Run], list[Slip]]:
    """The runs of one session as the file records them, in the order of testing, and the slips among them."""
    runs: list[Run] = []
    slips: list[Slip] = []
    begun: dict[str, int] = {}
    for plan in step["runs"]:
        characteristic = world.truths[plan["for"]].characteristic
        for batch in plan["batches"]:
            place = begun[characteristic] = begun.get(characteristic, -1) + 1
            for occasion in range(plan.get("runs", 1)):
                minute = MORNING[characteristic] + SPACING * place + AFTERNOON * occasion
                who = (parity + occasion) % 2
                run = Run(
                    batch=batch,
                    characteristic=characteristic,
                    tested_at=f"{step['session']}T{minute // 60:02}:{minute % 60:02}:00{ZONE}",
                    analyst=ANALYSTS[who],
                    instrument=INSTRUMENTS[characteristic][who],
                    session=step["session"],
                    values=world.values(plan["for"], batch, step["session"], occasion, plan["replicates"]),
                )
                slip = plan.get("slip", {})
                if slip.get("batch") == batch:
                    run, slipped = mistyped(run, slip["replicate"])
                    slips.append(slipped)
                runs.append(run)
    return sorted(runs, key=lambda run: (run.tested_at, run.batch)), slips


def mistyped(run: Run, replicate: int) -> tuple[Run, Slip]:
    """The run with one replicate's first digits swapped, and the slip that this is."""
    meant = run.values[replicate - 1]
    typed = swapped(meant)
    values = (*run.values[: replicate - 1], typed, *run.values[replicate:])
    return (
        Run(run.batch, run.characteristic, run.tested_at, run.analyst, run.instrument, run.session, values),
        Slip(run, replicate, meant, typed),
    )


def file_text(runs: Sequence[Run]) -> str:
    """The runs as a tidy CSV file, one row a replicate."""
    sheet = io.StringIO()
    writer = csv.writer(sheet, lineterminator="\n")
    writer.writerow(COLUMNS)
    for run in runs:
        writer.writerows(run.rows())
    return sheet.getvalue()


def taken(step: Json, runs: Sequence[Run]) -> Json:
    """The step of the tour that takes in a session's file, on the morning after."""
    day = np.datetime64(step["session"]) + np.timedelta64(1, "D")
    return {
        "act": "take",
        "at": f"{day}T09:00:00{ZONE}",
        "by": step["by"],
        "say": step["say"],
        "file": f"runs/{step['session']}.csv",
        "runs": len(runs),
        "replicates": sum(len(run.values) for run in runs),
    }


def amended(step: Json, slips: Sequence[Slip]) -> Json:
    """The step of the tour that corrects a slip: which measurement, what was typed, what it should be."""
    wanted = (step["session"], step["characteristic"], step["batch"], step["replicate"])
    (slip,) = (
        slip for slip in slips if (slip.run.session, slip.run.characteristic, slip.run.batch, slip.replicate) == wanted
    )
    kept = {key: value for key, value in step.items() if key != "session"}
    return kept | {"tested_at": slip.run.tested_at, "recorded": slip.typed, "value": slip.meant}


def make(folder: Path, story: Json | None = None) -> Json:
    """Write the scenario into a folder and return its list of steps.

    Args:
        folder: where runs/*.csv and scenario.json are written.
        story: the story to tell; by default the one in story.toml beside this script.
    """
    story = story or tomllib.loads((HERE / "story.toml").read_text(encoding="utf-8"))
    world = World(story)
    steps: list[Json] = []
    slips: list[Slip] = []
    files: dict[str, str] = {}
    for step in story["step"]:
        if step["act"] == "take":
            runs, slipped = session_runs(world, step, parity=len(files) % 2)
            slips.extend(slipped)
            done = taken(step, runs)
            files[done["file"]] = file_text(runs)
        elif step["act"] == "amend":
            done = amended(step, slips)
        else:
            done = step
        steps.append(done)
    scenario: Json = {"notice": "All names and numbers are invented.", "steps": steps}
    files["scenario.json"] = json.dumps(scenario, ensure_ascii=False, indent=2) + "\n"
    (folder / "runs").mkdir(parents=True, exist_ok=True)
    for name, text in files.items():
        (folder / name).write_bytes(text.encode("utf-8"))
    return scenario


if __name__ == "__main__":
    make(Path(sys.argv[1]) if len(sys.argv) > 1 else HERE)
