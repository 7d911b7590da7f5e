"""How long a nested fit takes beside statsmodels' MixedLM on the same model in the same run. Prints a markdown table.

    python tests/benchmarks/nested_speed.py [--sizes 10000 100000 1000000] [--peer-sizes 10000 100000]

Ours: labels read, components by REML, means and all pairs of 10 groups with Kenward-Roger's and with Satterthwaite's
degrees of freedom, Tukey-adjusted. The peer: the same components and means by REML, neither kind of degrees of
freedom. Processor seconds of one thread, best of three for ours, one run for the peer. Fixed seed.
"""

from __future__ import annotations

import argparse
import time
import warnings

import numpy as np
import pandas as pd

from sameline.stats.nested import fit_nested

GROUPS, BATCH_VALUES, RUNS = 10, 50, 5


def data(n: int, *, numbers: bool) -> pd.DataFrame:
    """n values of 10 groups, n/50 batches, up to 5 runs each, unbalanced."""
    rng = np.random.default_rng(n)
    batches = n // BATCH_VALUES
    batch, run = np.sort(rng.integers(0, batches, n)), rng.integers(0, RUNS, n)
    group = batch % GROUPS
    y = 10.0 + 0.1 * group + 0.5 * rng.normal(size=batches)[batch]
    y = y + 0.7 * rng.normal(size=(batches, RUNS))[batch, run] + rng.normal(size=n)
    labels = {"group": group, "batch": batch, "run": run}
    if not numbers:
        labels = {name: np.char.add(name, code.astype(str)).astype(object) for name, code in labels.items()}
    return pd.DataFrame({"value": np.round(y, 3), **labels})


def ours(frame: pd.DataFrame) -> tuple[float, dict[str, float]]:
    best = np.inf
    columns = [frame[name].to_numpy() for name in ("value", "group", "batch", "run")]
    for _ in range(3):
        start = time.process_time()
        for method in ("kenward-roger", "satterthwaite"):
            fit = fit_nested(*columns, df=method)
            fit.means()
            fit.pairs()
        best = min(best, time.process_time() - start)
    return best, dict(fit.components)


def peer(frame: pd.DataFrame) -> tuple[float, dict[str, float]]:
    import statsmodels.formula.api as smf

    start = time.process_time()
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")  # convergence chatter is the peer's own
        model = smf.mixedlm("value ~ C(group)", frame, groups="batch", re_formula="1", vc_formula={"run": "0 + C(run)"})
        found = model.fit(reml=True)
    spent = time.process_time() - start
    return spent, {
        "batch": float(found.cov_re.iloc[0, 0]),
        "run": float(found.vcomp[0]),
        "replicate": float(found.scale),
    }


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--sizes", type=int, nargs="*", default=[10_000, 100_000, 1_000_000])
    parser.add_argument("--peer-sizes", type=int, nargs="*", default=[10_000, 100_000])
    options = parser.parse_args()
    print("| values | runs | text labels, s | number labels, s | MixedLM, s | ratio | largest gap of components |")
    print("|---:|---:|---:|---:|---:|---:|---:|")
    for n in options.sizes:
        text, _ = ours(data(n, numbers=False))
        frame = data(n, numbers=True)
        number, components = ours(frame)
        runs = len(frame[["batch", "run"]].drop_duplicates())
        row = f"| {n} | {runs} | {text:.3f} | {number:.3f} |"
        if n in options.peer_sizes:
            spent, theirs = peer(frame)
            gap = max(abs(components[name] / theirs[name] - 1.0) for name in components)
            print(f"{row} {spent:.1f} | {spent / number:.0f} | {gap:.1e} |", flush=True)
        else:
            print(f"{row} | | |", flush=True)


if __name__ == "__main__":
    main()
