"""The benchmark script of the comparisons runs; its figures are for people, not for tests."""

import os
import subprocess
import sys
from pathlib import Path

SCRIPT = Path(__file__).parents[1] / "benchmarks" / "stats_speed.py"


def test_the_small_form_prints_every_row():
    run = subprocess.run(
        [sys.executable, str(SCRIPT), "--small"],
        capture_output=True,
        text=True,
        check=True,
        env={**os.environ, "PATH": "/nowhere"},  # without R, which is no need of the project
    )
    rows = [line.split(",")[0] for line in run.stdout.splitlines()[1:]]
    assert rows[:7] == ["Tukey-Kramer"] * 5 + ["Dunnett", "Games-Howell"]
    assert rows[7:] == [
        "tukey-kramer", "games-howell", "letters", "letters", "exact sums", "exact sums",
        "R is not at hand: no row for its TukeyHSD",
    ]  # fmt: skip
