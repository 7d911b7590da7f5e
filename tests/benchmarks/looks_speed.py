"""How long one open look takes, beside a peer measured in the same run. Prints a markdown table.

python tests/benchmarks/looks_speed.py
"""

from __future__ import annotations

import sys
import time
from itertools import combinations
from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np

sys.path.insert(0, str(Path(__file__).parents[1] / "stats" / "looks"))

import literal

from sameline.stats.looks import UnitMeans, judge_open
from sameline.stats.looks.blocks import block_parts, log_block_evidence
from sameline.stats.looks.closed import close_over_partitions, closed_p_few
from sameline.stats.looks.many import closed_p_many
from sameline.stats.studentized_range import studentized_range_sf

if TYPE_CHECKING:
    from collections.abc import Callable


def milliseconds(call: Callable[[], object], repeats: int = 7) -> float:
    """The least time of some runs, after one that warms up."""
    call()
    times = []
    for _ in range(repeats):
        start = time.perf_counter()
        call()
        times.append(time.perf_counter() - start)
    return 1000 * min(times)


def look(groups: int) -> UnitMeans:
    """Twelve units a group; the last group differs."""
    rng = np.random.default_rng(groups)
    means = rng.standard_normal(groups) / np.sqrt(12)
    means[-1] += 1.5
    labels = tuple(f"lot {i}" for i in range(groups))
    return UnitMeans(labels, (12,) * groups, tuple(means.tolist()), 1.0, 11.0 * groups)


def every_partition(groups: int) -> Callable[[], object]:
    """Closed testing with every partition written out, on the same block evidence."""
    logs = log_block_evidence(*look(groups).arrays(), 1.0)
    parts = block_parts(groups)
    evidence = {
        tuple(np.flatnonzero(row).tolist()): float(row.sum() * np.exp(log))
        for row, log in zip(parts.members, logs, strict=True)
    }
    return lambda: literal.closed_p(evidence, groups)


def main() -> None:
    """Prints the table."""
    print("| what | ms | peer | ms | ratio |\n|---|---|---|---|---|")
    for groups in (5, 8):
        logs = log_block_evidence(*look(groups).arrays(), 1.0)
        fast = milliseconds(lambda logs=logs, groups=groups: close_over_partitions(logs, groups))
        slow = milliseconds(every_partition(groups), 3)
        ratio = f"{slow / fast:.0f}"
        print(f"| search over partitions, {groups} groups | {fast:.2f} | every partition | {slow:.2f} | {ratio} |")
    for groups, closed in ((10, closed_p_few), (40, closed_p_many)):
        seen = look(groups)
        own = milliseconds(lambda seen=seen, closed=closed: closed(*seen.arrays(), 1.0))
        q = np.array([abs(a - b) for a, b in combinations(seen.means, 2)]) * np.sqrt(12)
        tukey = milliseconds(lambda q=q, seen=seen, groups=groups: studentized_range_sf(q, groups, seen.df))
        print(f"| closed test, {groups} groups | {own:.2f} | Tukey p-values | {tukey:.2f} | {tukey / own:.2f} |")
        whole = milliseconds(lambda seen=seen: judge_open(seen))
        print(f"| whole look, {groups} groups | {whole:.2f} | Tukey p-values | {tukey:.2f} | {tukey / whole:.2f} |")


if __name__ == "__main__":
    main()
