"""How often a difference is claimed where there is none: nested, or replicates as units. Prints a markdown table.

    python tests/benchmarks/nested_false_claims.py [--repeats 1000] [--rows 0 27]

Five groups without any true difference, Tukey's procedure at 5 %, one look. A claim counts when any of the ten pairs
is shown to differ. Columns: the nested model with Kenward-Roger's degrees of freedom (the default), with
Satterthwaite's, and Tukey-Kramer on replicates as if each were independent evidence. Fixed seeds; the standard error
of a rate p from n repeats is sqrt(p (1 - p) / n), 0.0069 at p = 0.05 and n = 1000.
"""

from __future__ import annotations

import argparse
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from sameline.stats import compare_pairs
from sameline.stats.nested import fit_nested

if TYPE_CHECKING:
    from collections.abc import Iterator

ALPHA = 0.05
GROUPS = 5


@dataclass(frozen=True)
class Scene:
    """Runs a group, whether their numbers and replicates are unequal, and spreads over that of replicates."""

    runs: int
    unbalanced: bool
    run_sd: float
    batches: int = 0
    batch_sd: float = 0.0

    @property
    def name(self) -> str:
        level = f"{self.batches} batches of {self.runs} runs" if self.batches else f"{self.runs} runs"
        return f"{level}{', unbalanced' if self.unbalanced else ''}"


@dataclass(frozen=True)
class Rates:
    """Shares of repeats with a claim; `zero` is the share of fits with a component at zero."""

    repeats: int
    kenward_roger: float
    satterthwaite: float
    replicates: float
    zero: float

    @property
    def error(self) -> float:
        """Monte-Carlo standard error of a rate of 5 %."""
        return (ALPHA * (1 - ALPHA) / self.repeats) ** 0.5


def scenes() -> Iterator[Scene]:
    for unbalanced in (False, True):
        for runs in (3, 5, 10, 20):
            for run_sd in (0.0, 0.7, 2.0):
                yield Scene(runs, unbalanced, run_sd)
    for batch_sd, run_sd in ((0.0, 0.0), (0.7, 0.7), (2.0, 0.7)):
        yield Scene(2, unbalanced=True, run_sd=run_sd, batches=4, batch_sd=batch_sd)


def plan_of(scene: Scene, rng: np.random.Generator) -> np.ndarray:
    """Group, batch and run of each value, shape (3, n); unbalanced: half to 1.5 times the runs, 1 to 5 values each."""
    rows = []
    for group in range(GROUPS):
        for batch in range(scene.batches or 1):
            spread = scene.runs // 2
            runs = scene.runs + (int(rng.integers(-spread, spread + 1)) if scene.unbalanced else 0)
            if scene.unbalanced and not scene.batches:
                runs = max(runs, 2)
            for run in range(runs):
                rows += [(group, batch, run)] * (int(rng.integers(1, 6)) if scene.unbalanced else 3)
    return np.array(rows).T


def rates(scene: Scene, repeats: int, seed: int) -> Rates:
    """Simulates one scene; the design is drawn once, the values each time."""
    rng = np.random.default_rng(seed)
    group, batch, run = plan_of(scene, rng)
    of_batch = np.unique(group * 100 + batch, return_inverse=True)[1]
    of_run = np.unique((group * 100 + batch) * 100 + run, return_inverse=True)[1]
    labels = [[f"{name}{code}" for code in codes] for name, codes in (("g", group), ("b", batch), ("r", run))]
    hits = np.zeros(4)
    for _ in range(repeats):
        y = rng.normal(size=group.size) + scene.run_sd * rng.normal(size=of_run.max() + 1)[of_run]
        y += scene.batch_sd * rng.normal(size=of_batch.max() + 1)[of_batch]
        fit = fit_nested(y, labels[0], labels[1] if scene.batches else None, labels[2])
        other = fit.using("satterthwaite")
        hits += (
            any(pair.differs for pair in fit.pairs(ALPHA).pairs),
            any(pair.differs for pair in other.pairs(ALPHA).pairs),
            bool(compare_pairs(y, labels[0], procedure="tukey-kramer", alpha=ALPHA).differs.any()),
            bool(fit.at_zero),
        )
    return Rates(repeats, *(hits / repeats).tolist())


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--repeats", type=int, default=1000)
    parser.add_argument("--rows", type=int, nargs=2, default=(0, 99), help="first row, and the one after the last")
    options = parser.parse_args()
    repeats = options.repeats
    print(f"{repeats} repeats a row; Monte-Carlo standard error of 0.05: {Rates(repeats, 0, 0, 0, 0).error:.4f}\n")
    print(
        "| five groups, each | batch sd | run sd | nested, Kenward-Roger | Satterthwaite | replicates as units | zero |"
    )
    print("|---|---:|---:|---:|---:|---:|---:|")
    for seed, scene in enumerate(scenes()):
        if not options.rows[0] <= seed < options.rows[1]:
            continue
        found = rates(scene, repeats, seed)
        figures = (found.kenward_roger, found.satterthwaite, found.replicates)
        cells = " | ".join(f"{figure:.3f}" for figure in figures)
        print(f"| {scene.name} | {scene.batch_sd:g} | {scene.run_sd:g} | {cells} | {found.zero:.2f} |", flush=True)


if __name__ == "__main__":
    main()
