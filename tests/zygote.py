"""A process that imports everything once, and forks a child for each task: to be killed, or to be one of a crowd.

It reads tasks as JSON lines and answers each by a JSON line:

    {"store": ..., "action": "log", "seed": 3, "after": 2, "share": 0.7}   a child does two acts and is killed at 0.7 of
                                                                        the time that an act has taken it
    {"store": ..., "action": "crowd", "processes": 8, "runs": 5}   so many children at once, each to its end
"""

from __future__ import annotations

import importlib.util
import json
import os
import random
import signal
import sys
import time
from collections.abc import Callable, Iterator
from pathlib import Path
from typing import Any, TextIO

import scipy.stats  # noqa: F401 - loaded before the children are forked

import sameline.stats  # noqa: F401 - the same
from sameline.lab import Lab, open_lab

_spec = importlib.util.spec_from_file_location("laboratory", Path(__file__).with_name("laboratory.py"))
laboratory = importlib.util.module_from_spec(_spec)
_spec.loader.exec_module(laboratory)


def log(lab: Lab, rng: random.Random) -> Iterator[int]:
    """Runs logged one by one; each conclusion that follows is part of it."""
    while True:
        batch, day = rng.choice(("B1", "B2", "B3")), rng.randint(10, 300)
        yield lab.record([laboratory.run(batch, day, f"{rng.uniform(69, 74):.1f}", "70.0")]).entry


def amend(lab: Lab, rng: random.Random) -> Iterator[int]:
    """Values corrected, set aside and put back."""
    while True:
        run = rng.randint(1, 8)
        measurement = lab.find_measurements(run, 1)[0]
        value = laboratory.replicate(1, f"{rng.uniform(69, 74):.2f}")
        yield lab.amend(measurement, value, reason="a slip").entry
        if measurement.excluded is None:  # else a worker was killed between this and what follows
            yield lab.exclude("instrument fault", run=run, reason="worn").entry
        yield lab.restore(run=run, reason="not worn").entry


def take(lab: Lab, rng: random.Random, rows: int) -> Iterator[int]:
    """Large files taken in."""
    while True:
        texts = [f"{rng.uniform(10, 20):.2f}" for _ in range(10)]
        runs = [laboratory.run("B1", 10 + day, *texts, characteristic="set") for day in range(rows // 10)]
        yield lab.record(runs, laboratory.source(f"file {rng.random()}")).entry


def conclude(lab: Lab, rng: random.Random) -> Iterator[int]:
    """Comparisons restated: all the work is in the conclusion."""
    while True:
        alpha = rng.choice((0.01, 0.02, 0.05, 0.1))
        yield lab.compare(laboratory.statement("batches", alpha=alpha), reason="another look").entry


ACTIONS: dict[str, Callable[..., Iterator[int]]] = {"log": log, "amend": amend, "take": take, "conclude": conclude}


def killed(task: dict[str, Any]) -> dict[str, Any]:
    """Let a child work, kill it in the midst of it, and say what it had acknowledged by then."""
    heard, said = os.pipe()
    child = os.fork()
    if child == 0:
        with os.fdopen(said, "w") as speaker:
            work(task, speaker)
        os._exit(0)
    os.close(said)
    with os.fdopen(heard) as listener:
        lines = [listener.readline()]
        began = time.monotonic()
        while len(lines) <= task["after"] and lines[-1]:
            lines.append(listener.readline())
        time.sleep(task["share"] * (time.monotonic() - began) / task["after"])
        os.kill(child, signal.SIGKILL)
        os.waitpid(child, 0)
        lines += listener
    complete = [line.strip() for line in lines if line.endswith("\n")]
    return {
        "acknowledged": [int(line) for line in complete if line.isdigit()],
        "errors": [line for line in complete if line.startswith("error")],
    }


def work(task: dict[str, Any], speaker: TextIO) -> None:
    """The child's part: a line when it is ready, then one for each act that is done."""
    rng = random.Random(task["seed"])  # noqa: S311 - chance, not secrecy
    try:
        with open_lab(task["store"], by="ana") as lab:
            print("ready", file=speaker, flush=True)
            rows = {"rows": task["rows"]} if task["action"] == "take" else {}
            for entry in ACTIONS[task["action"]](lab, rng, **rows):
                print(entry, file=speaker, flush=True)
    except Exception as error:  # noqa: BLE001 - whatever it is, the test must hear of it
        print(f"error {error!r}", file=speaker, flush=True)


def crowd(task: dict[str, Any]) -> dict[str, Any]:
    """Many children record runs at once; what each of them says of it."""
    children = [_one_of_a_crowd(task, number) for number in range(task["processes"])]
    said = []
    for child, heard in children:
        with os.fdopen(heard) as listener:
            said += [line.strip() for line in listener]
        os.waitpid(child, 0)
    return {"said": said}


def _one_of_a_crowd(task: dict[str, Any], number: int) -> tuple[int, int]:
    heard, said = os.pipe()
    child = os.fork()
    if child:
        os.close(said)
        return child, heard
    os.close(heard)
    with os.fdopen(said, "w") as speaker:
        try:
            with open_lab(task["store"], by=("ana", "ben")[number % 2]) as lab:
                for day in range(task["runs"]):
                    texts = (f"{70 + number / 10:.1f}", f"{70 + day % 7 / 10:.1f}")
                    outcome = lab.record([laboratory.run(f"B{1 + number % 4}", 10 + day, *texts, session=f"p{number}")])
                    print(f"done {outcome.entry} {len(outcome.behind)}", file=speaker)
        except Exception as error:  # noqa: BLE001 - whatever it is, the test must hear of it
            print(f"error {error!r}", file=speaker)
    os._exit(0)


def main() -> None:
    """Answer tasks until the input ends."""
    for line in sys.stdin:
        task = json.loads(line)
        answer = crowd(task) if task["action"] == "crowd" else killed(task)
        print(json.dumps(answer), flush=True)


if __name__ == "__main__":
    main()
