"""How often each way of looking claims what is not there, and how soon it sees what is. Prints markdown tables.

    python tests/benchmarks/looks_false_claims.py [--repeats 10000] [--power-repeats 1000] [--table null]

Fixed seeds: the same command prints the same tables. All rates are for the whole family of pairs over all looks at
alpha 0.05; the standard error of a rate p from n histories is sqrt(p (1 - p) / n), 0.0022 at p = 0.05 and n = 10000.
"""

from __future__ import annotations

import argparse
import math
import time
from functools import lru_cache
from typing import TYPE_CHECKING

import numpy as np
from looks_paths import (
    Paths,
    Scene,
    cumulate,
    first_contrasts,
    first_interval_miss,
    first_naive,
    first_open,
    first_true,
    first_union,
    largest_q,
    simulate,
)

from sameline.stats.looks.amendments import RESERVE
from sameline.stats.looks.boundaries import foreseen_boundaries
from sameline.stats.looks.closed import closed_p_few
from sameline.stats.looks.many import log_pair_evidence, pair_indices
from sameline.stats.looks.open_looks import PHI
from sameline.stats.looks.shares import with_joiners
from sameline.stats.looks.union import GROWTH
from sameline.stats.looks.windows import window_part

if TYPE_CHECKING:
    from collections.abc import Callable, Iterator

    from numpy.typing import NDArray

    Floats = NDArray[np.float64]

ALPHA = 0.05
MAIN = ALPHA * (1.0 - RESERVE)
NEVER = np.inf
PLAN_DRAWS = 200_000


def null_scenes() -> Iterator[Scene]:
    """The null rows of the table."""
    for groups in (3, 5, 10):
        for looks in (10, 30, 100):
            yield Scene(groups, looks, "units")
            for run_sd in (0.0, 0.7) if groups * looks < 1000 else (0.7,):
                yield Scene(groups, looks, "runs", run_sd)
                yield Scene(groups, looks, "unbalanced", run_sd)
    yield Scene(40, 30, "units")
    yield Scene(40, 30, "runs", 0.7)
    yield Scene(5, 30, "units", spreads=(1.0, 1.0, 1.0, 1.0, 3.0))


def chunks(scene: Scene, repeats: int) -> Iterator[tuple[int, int]]:
    """(size, seed) of each part of the histories, small enough for the memory of a laptop."""
    size = max(50, min(repeats, 3_000_000 // (scene.looks * scene.groups * 4)))
    for at, start in enumerate(range(0, repeats, size)):
        yield (
            min(size, repeats - start),
            1_000_003 * scene.groups + 1_009 * scene.looks + 7 * at + int(10 * scene.run_sd),
        )


@lru_cache
def plan_boundaries(groups: int, looks: int, per: int) -> tuple[float, ...]:
    """Boundaries of a plan with these looks, `per` units a group at each, O'Brien-Fleming-like, at the open rate."""
    counts = tuple((per * (look + 1),) * groups for look in range(looks))
    fractions = [(look + 1) / looks for look in range(looks)]
    edges = foreseen_boundaries(counts, MAIN, "obrien-fleming", fractions, draws=PLAN_DRAWS, seed=5)
    return tuple(NEVER if edge is None else edge for edge in edges)


def plannable(scene: Scene) -> bool:
    """Whether the table shows a plan for this scene: equal arrivals, and few enough looks to simulate quickly."""
    return scene.arrivals != "unbalanced" and scene.looks <= 30 and scene.groups <= 10 and not scene.spreads


def ways(scene: Scene) -> dict[str, Callable[[Paths], Floats]]:
    """Each way of looking, by its column."""
    asked = np.ones(scene.groups * (scene.groups - 1) // 2, dtype=bool)
    uneven = scene.arrivals == "unbalanced" or bool(scene.spreads)
    found: dict[str, Callable[[Paths], Floats]] = {
        "open": lambda paths: first_open(paths, MAIN, asked),
        "intervals": lambda paths: first_interval_miss(paths, MAIN),
        "union": lambda paths: first_union(paths, MAIN, GROWTH, own_spreads=uneven),
        "union, every look": lambda paths: first_union(paths, MAIN, 1.0, own_spreads=uneven),
        "naive, units": lambda paths: first_naive(paths, ALPHA),
    }
    if uneven:
        unit_sd = 1.0 if scene.spreads else math.sqrt(scene.run_sd**2 + 1.0 / 3.0)
        found["open, contrasts"] = lambda paths: first_contrasts(paths, MAIN, unit_sd)
    if scene.arrivals != "units":
        found["naive, replicates"] = lambda paths: first_naive(paths, ALPHA, replicates=True)
    if plannable(scene):
        per = scene.per_look if scene.arrivals == "units" else 1
        edges = np.array(plan_boundaries(scene.groups, scene.looks, per))
        found["planned"] = lambda paths: first_true(largest_q(paths.n, paths.means, paths.ss, paths.df) > edges)
    return found


def run(scene: Scene, repeats: int, columns: tuple[str, ...]) -> dict[str, Floats]:
    """First look with a claim in each history, by way of looking."""
    chosen = {name: way for name, way in ways(scene).items() if name in columns}
    parts: dict[str, list[Floats]] = {name: [] for name in chosen}
    for size, seed in chunks(scene, repeats):
        paths = simulate(scene, size, seed)
        for name, way in chosen.items():
            parts[name].append(way(paths))
    return {name: np.concatenate(found) for name, found in parts.items()}


def describe(scene: Scene) -> str:
    """The data of a scene in words."""
    if scene.spreads:
        return "3 values a look, one group's spread three times the others'"
    return {
        "units": f"{scene.per_look} values a look",
        "runs": f"one run a look, run spread {scene.run_sd}",
        "unbalanced": f"uneven runs of 1-5, run spread {scene.run_sd}",
    }[scene.arrivals]


NULL_COLUMNS = (
    "open",
    "intervals",
    "open, contrasts",
    "planned",
    "union",
    "union, every look",
    "naive, units",
    "naive, replicates",
)


def null_table(repeats: int, groups: list[int]) -> None:
    """False claims over all looks when nothing differs."""
    print(f"\nFalse claims over all looks, nothing differs, {repeats} histories a row, alpha 0.05\n")
    header(("groups", "looks", "data", *NULL_COLUMNS))
    for scene in (scene for scene in null_scenes() if scene.groups in groups):
        found = run(scene, repeats, NULL_COLUMNS)
        cells = [f"{np.mean(np.isfinite(found[name])):.4f}" if name in found else "" for name in NULL_COLUMNS]
        row(scene.groups, scene.looks, describe(scene), *cells)


def strong_table(repeats: int) -> None:
    """False claims among equal groups while one group differs."""
    print(f"\nFalse claims among the equal groups while the last one differs by 1 sd, {repeats} histories a row\n")
    header(("groups", "looks", "data", "open"))
    for scene in (
        Scene(3, 30, "units", shift=1.0),
        Scene(5, 30, "units", shift=1.0),
        Scene(5, 30, "runs", 0.7, shift=1.0),
    ):
        _, b = pair_indices(scene.groups)
        equal = b < scene.groups - 1
        found = [first_open(simulate(scene, size, seed), MAIN, equal) for size, seed in chunks(scene, repeats)]
        row(scene.groups, scene.looks, describe(scene), f"{np.mean(np.isfinite(np.concatenate(found))):.4f}")


def power_scenes() -> Iterator[Scene]:
    """Rows in which the last group differs, from the first look or from the eleventh."""
    for groups in (3, 5, 10, 40):
        for shift, start in ((1.0, 0), (2.0, 0), (1.0, 10)):
            yield Scene(groups, 30, "units", shift=shift, start=start)
    for groups in (5, 10):
        for shift, start in ((1.0, 0), (2.0, 0), (1.0, 10), (2.0, 10)):
            yield Scene(groups, 30, "runs", 0.7, shift=shift, start=start)
    yield Scene(5, 100, "runs", 0.7, shift=1.0, start=10)
    yield Scene(5, 30, "unbalanced", 0.7, shift=2.0)


POWER_COLUMNS = ("open", "planned", "union", "union, every look", "naive, units")


def power_table(repeats: int) -> None:
    """How soon a difference is seen: first claim of any pair."""
    print(f"\nFirst claim of any pair when the last group differs, {repeats} histories a row, a quarter for 10 and 40")
    print("groups: median look (share found by the last look)\n")
    header(("groups", "looks", "data", "shift", *POWER_COLUMNS))
    for scene in power_scenes():
        found = run(scene, repeats if scene.groups < 10 else repeats // 4, POWER_COLUMNS)
        cells = [seen(found[name]) if name in found else "" for name in POWER_COLUMNS]
        since = f"{scene.shift:g} sd" + (f" from look {scene.start + 1}" if scene.start else "")
        row(scene.groups, scene.looks, describe(scene), since, *cells)


def seen(first: Floats) -> str:
    """Median first look and share found."""
    median = np.median(first)
    return (
        f"{median:.0f} ({np.isfinite(first).mean():.3f})"
        if math.isfinite(median)
        else f"- ({np.isfinite(first).mean():.3f})"
    )


def window_table(repeats: int) -> None:
    """Windows of 20 looks beside the whole record, three groups, sixty looks."""
    print(
        f"\nWindows of 20 looks beside the whole record, 3 groups, 60 looks of one unit a group, {repeats} histories\n"
    )
    header(("the last group", "whole record alone", "whole and windows together"))
    for words, shift, start in (
        ("never differs", 0.0, 0),
        ("differs by 1 sd from look 41", 1.0, 40),
        ("by 2 sd from look 41", 2.0, 40),
    ):
        alone, together = [], []
        scene = Scene(3, 60, "units", per_look=1, shift=shift, start=start)
        for size, seed in chunks(scene, repeats):
            paths = simulate_runs(scene, size, seed)
            asked = np.ones(3, dtype=bool)
            alone.append(first_open(whole(paths), MAIN, asked))
            parts = [first_open(whole(paths), MAIN * window_part(0), asked)]
            for number in (1, 2, 3):
                part = whole(paths[:, 20 * (number - 1) : 20 * number])
                parts.append(first_open(part, MAIN * window_part(number), asked) + 20 * (number - 1))
            together.append(np.min(parts, axis=0))
        row(words, seen(np.concatenate(alone)), seen(np.concatenate(together)))


def simulate_runs(scene: Scene, size: int, seed: int) -> Floats:
    """(B, J, k) single units."""
    drift = np.zeros((scene.looks, scene.groups))
    drift[scene.start :, -1] = scene.shift
    return np.random.default_rng(seed).standard_normal((size, scene.looks, scene.groups)) + drift


def whole(values: Floats, there: Floats | None = None) -> Paths:
    """Paths of single units, cumulated from the first look given."""
    counts = np.ones(values.shape) if there is None else there
    n, means, own = cumulate(counts, values, np.zeros(values.shape))
    df = n.sum(-1) - (n > 0).sum(-1)
    return Paths(n, means, own.sum(-1), df, own, n, means, own.sum(-1), df)


def joining_table(repeats: int) -> None:
    """Three founders, a new group every five looks, up to ten groups."""
    print(f"\nGroups that join: 3 founders, one more every 5 looks up to 10 groups, 60 looks, {repeats} histories\n")
    header(("", "share"))
    for words, shift in (
        ("false claims, nothing differs", 0.0),
        ("the sixth group differs by 2 sd: some pair of it claimed", 2.0),
    ):
        found = []
        found += [joined(size, seed, shift) for size, seed in chunks(Scene(10, 60, "units"), repeats)]
        row(words, f"{np.mean(np.concatenate(found)):.4f}")


def joined(size: int, seed: int, shift: float) -> NDArray[np.bool_]:
    """(B,) whether any pair (of the sixth group, when it differs) is ever claimed."""
    groups, looks, founders = 10, 60, 3
    there = np.zeros((looks, groups))
    for i in range(groups):
        there[max(0, 5 * (i - founders + 1)) :, i] = 1.0
    values = np.random.default_rng(seed).standard_normal((size, looks, groups))
    values[..., 5] += shift
    paths = whole(values, np.broadcast_to(there, values.shape))
    logs = log_pair_evidence(paths.means, paths.n, paths.ss, paths.df, PHI)
    first = closed_p_few(paths.means[..., :founders], paths.n[..., :founders], paths.ss, paths.df, PHI)
    p = with_joiners(first, logs, groups, founders, control=False)
    a, b = pair_indices(groups)
    asked = (a == 5) | (b == 5) if shift else np.ones(a.size, dtype=bool)
    return (p[..., asked] <= MAIN).any(axis=(1, 2))


def header(names: tuple[str, ...]) -> None:
    """Prints the head of a markdown table."""
    print("| " + " | ".join(names) + " |")
    print("|" + "---|" * len(names))


def row(*cells: object) -> None:
    """Prints a row of a markdown table."""
    print("| " + " | ".join(map(str, cells)) + " |", flush=True)


def main() -> None:
    """Prints the tables asked for."""
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--repeats", type=int, default=10_000)
    parser.add_argument("--power-repeats", type=int, default=1_000)
    parser.add_argument("--table", choices=["null", "strong", "power", "windows", "joining"], action="append")
    parser.add_argument("--groups", type=int, nargs="*", default=[3, 5, 10, 40], help="rows of the null table")
    options = parser.parse_args()
    asked = options.table or ["null", "strong", "power", "windows", "joining"]
    start = time.process_time()
    tables: dict[str, Callable[[], None]] = {
        "null": lambda: null_table(options.repeats, options.groups),
        "strong": lambda: strong_table(options.repeats),
        "power": lambda: power_table(options.power_repeats),
        "windows": lambda: window_table(options.repeats),
        "joining": lambda: joining_table(options.repeats),
    }
    for name in asked:
        tables[name]()
    print(f"\nProcessor time {time.process_time() - start:.0f} s.")


if __name__ == "__main__":
    main()
