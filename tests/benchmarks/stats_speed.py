"""Prints how fast the comparisons of groups are, beside scipy and statsmodels measured in the same run.

    python tests/benchmarks/stats_speed.py            # the whole table, a few minutes
    python tests/benchmarks/stats_speed.py --small    # the same on a few groups, in seconds: that the script works

Every figure is the median of at least five runs, ours and the peer's in turn, in processor time of one thread, which
on an idle machine is the time by the clock. Before each of our runs all tables kept from earlier runs are dropped, but
for the row about a second call. Peers give the same figures: all pairs' tests with their simultaneous intervals. If R
is at hand its TukeyHSD is timed too.
"""

from __future__ import annotations

import argparse
import importlib
import os
import shutil
import statistics
import subprocess
import time
from dataclasses import dataclass
from functools import partial
from typing import TYPE_CHECKING

# one thread for everybody
os.environ.setdefault("OMP_NUM_THREADS", "1")

import numpy as np
import scipy.stats
from statsmodels.stats.multicomp import pairwise_tukeyhsd

from sameline.stats import compare_pairs
from sameline.stats.exact_sums import group_sums
from sameline.stats.lines import lines

if TYPE_CHECKING:
    from collections.abc import Callable, Sequence

TABLES = ("panels", "range_tail", "range_curves", "range_lower_tail", "studentized_range", "dunnett_distribution")


@dataclass(frozen=True)
class Scale:
    """How large the table's work is: groups of the middling and the large comparison, and runs."""

    middling: int
    large: int
    few: int
    runs: int
    rows: int


FULL = Scale(middling=40, large=200, few=10, runs=5, rows=1_000_000)
SMALL = Scale(middling=5, large=8, few=4, runs=1, rows=1000)


def drop_tables() -> None:
    """Forgets every table kept from an earlier call."""
    for name in TABLES:
        module = importlib.import_module(f"sameline.stats.{name}")
        for thing in vars(module).values():
            if hasattr(thing, "cache_clear"):
                thing.cache_clear()


def made_up(groups: int, each: int = 6, apart: float = 0.0) -> tuple[np.ndarray, np.ndarray]:
    """Invented data with two decimals; `apart` is the means' spread in units of the values'. It slows scipy down."""
    rng = np.random.default_rng(groups)
    values = rng.normal(50.0, 1.0, groups * each) + np.repeat(rng.normal(0.0, 1.0, groups), each) * apart
    return np.round(values, 2), np.repeat([f"G{i:03d}" for i in range(groups)], each)


def seconds(work: Callable[[], object], *, cold: bool = True) -> float:
    """Processor time of one run; everything here runs in one thread, and other programs do not count."""
    if cold:
        drop_tables()
    start = time.process_time()
    work()
    return time.process_time() - start


def medians(works: Sequence[Callable[[], object]], runs: int) -> list[float]:
    """Median times of several works, run in turn."""
    times = [[seconds(work) for work in works] for _ in range(runs)]
    return [statistics.median(column) for column in zip(*times, strict=True)]


def show(what: str, ours: float, other: str, theirs: float, wanted: str) -> None:
    """Prints a row."""
    ratio = f"{theirs / ours:8.1f}"
    print(f"{what:<46}{ours * 1e3:10.2f} ms   {other:<34}{theirs * 1e3:11.2f} ms {ratio}   {wanted}")


def split(values: np.ndarray, labels: np.ndarray) -> list[np.ndarray]:
    """The values of each group."""
    return [values[labels == label] for label in dict.fromkeys(labels.tolist())]


def scipy_tukey(samples: list[np.ndarray]) -> object:
    """All pairs with intervals by scipy."""
    return scipy.stats.tukey_hsd(*samples).confidence_interval(0.95)


def scipy_dunnett(samples: list[np.ndarray]) -> object:
    """Comparisons with a control and intervals by scipy."""
    return scipy.stats.dunnett(*samples[1:], control=samples[0], rng=np.random.default_rng(1)).confidence_interval()


def pairs_rows(scale: Scale) -> None:
    """All pairs under a common variance."""
    for name, apart in (("alike", 0.0), ("apart", 1.0)):
        values, labels = made_up(scale.middling, apart=apart)
        samples = split(values, labels)
        works: list[Callable[[], object]] = [
            partial(compare_pairs, values, labels),
            partial(scipy_tukey, samples),
            partial(pairwise_tukeyhsd, values, labels),
        ]
        ours, by_scipy, by_statsmodels = medians(works, scale.runs)
        what = f"Tukey-Kramer, {scale.middling} groups, means {name}"
        show(what, ours, "scipy.stats.tukey_hsd", by_scipy, ">= 150")
        show(what, ours, "statsmodels pairwise_tukeyhsd", by_statsmodels, ">= 80")
    many, few = made_up(scale.large), split(*made_up(scale.few))
    ours, theirs = medians([lambda: compare_pairs(*many), lambda: scipy_tukey(few)], scale.runs)
    show(f"Tukey-Kramer, {scale.large} groups", ours, f"scipy.stats.tukey_hsd, {scale.few} groups", theirs, "> 1")


def other_rows(scale: Scale) -> None:
    """With a control, and with unequal variances."""
    values, labels = made_up(scale.middling)
    samples = split(values, labels)
    ours, theirs = medians(
        [lambda: compare_pairs(values, labels, "dunnett", control=labels[0]), lambda: scipy_dunnett(samples)],
        scale.runs,
    )
    show(f"Dunnett, {scale.middling} groups", ours, "scipy.stats.dunnett", theirs, ">= 150")
    unequal, common = medians(
        [lambda: compare_pairs(values, labels, "games-howell"), lambda: compare_pairs(values, labels)],
        max(scale.runs, 9),
    )
    show(f"Games-Howell, {scale.middling} groups", unequal, "our own Tukey-Kramer", common, ">= 0.33")


def own_rows(scale: Scale) -> None:
    """Figures with no peer: a second call, letters, sums."""
    for procedure in ("tukey-kramer", "games-howell"):
        many = made_up(scale.large)
        compare_pairs(*many, procedure)
        again = statistics.median(seconds(partial(compare_pairs, *many, procedure), cold=False) for _ in range(9))
        wanted = "<= 10 ms" if procedure == "tukey-kramer" else ""
        print(f"{procedure + ', ' + str(scale.large) + ' groups, second call':<46}{again * 1e3:10.2f} ms   {wanted}")
    for name, differs in hard_patterns(scale.large).items():
        label = [f"G{i:03d}" for i in range(len(differs))]
        work = partial(lines, label, range(len(label)), differs)
        took = statistics.median(seconds(work) for _ in range(scale.runs))
        print(f"{f'letters, {scale.large} groups, {name}':<46}{took * 1e3:10.2f} ms   <= 1000 ms")
    rng = np.random.default_rng(5)
    recorded = np.round(rng.normal(50.0, 3.0, scale.rows), 2)
    codes = rng.integers(0, scale.middling, scale.rows)
    codes[: scale.middling] = np.arange(scale.middling)
    for name, values in (("two decimals", recorded), ("computed", recorded / 3.0)):
        work = partial(group_sums, values, codes, scale.middling)
        took = statistics.median(seconds(work) for _ in range(scale.runs))
        print(f"{f'exact sums, {scale.rows} values, {name}':<46}{took * 1e3:10.2f} ms   well under 1000 ms")


def hard_patterns(groups: int) -> dict[str, np.ndarray]:
    """Matrices of pairs for which letters are hard: real unequal sizes, and a band with a tenth of its pairs turned."""
    rng = np.random.default_rng(groups)
    each = rng.integers(3, 13, groups)
    labels = np.repeat([f"G{i:03d}" for i in range(groups)], each)
    values = np.round(rng.normal(size=labels.size) + np.repeat(rng.normal(0.0, 2.0, groups), each), 3)
    result = compare_pairs(values, labels)
    unequal = np.zeros((groups, groups), dtype=bool)
    unequal[result.question.first, result.question.second] = result.differs
    away = np.abs(np.subtract.outer(np.arange(groups), np.arange(groups)))
    band = (away > groups // 8) ^ ((rng.random((groups, groups)) < 0.1) & (away > groups // 10) & (away < groups // 6))
    order = np.argsort(result.question.samples.deviation)
    unequal = (unequal | unequal.T)[np.ix_(order, order)]
    return {"unequal sizes": unequal, "a torn band": np.triu(band, 1) | np.triu(band, 1).T}


def r_rows(scale: Scale) -> None:
    """R's TukeyHSD, where R is at hand."""
    rscript = shutil.which("Rscript")
    if rscript is None:
        print("R is not at hand: no row for its TukeyHSD")
        return
    for groups in (scale.middling, scale.large):
        values, labels = made_up(groups)
        code = (
            f"v<-c({','.join(map(repr, values.tolist()))}); g<-factor(rep(1:{groups}, each=6)); a<-aov(v~g); "
            f"cat(median(replicate({scale.runs}, system.time(TukeyHSD(a))[['elapsed']])))"
        )
        theirs = float(subprocess.run([rscript, "-e", code], capture_output=True, text=True, check=True).stdout)
        (ours,) = medians([partial(compare_pairs, values, labels)], scale.runs)
        show(f"Tukey-Kramer, {groups} groups", ours, "R TukeyHSD", theirs, "")


def main() -> None:
    """Prints the table."""
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--small", action="store_true", help="a few groups and one run: only that the script works")
    scale = SMALL if parser.parse_args().small else FULL
    compare_pairs(*made_up(3))
    print(f"{'work':<46}{'ours':>13}   {'peer':<34}{'its time':>14}    ratio   wanted")
    pairs_rows(scale)
    other_rows(scale)
    own_rows(scale)
    r_rows(scale)


if __name__ == "__main__":
    main()
