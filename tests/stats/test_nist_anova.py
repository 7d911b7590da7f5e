"""The eleven NIST StRD one-way analysis of variance sets, as the certified files inside the scipy wheel give them.

Source: NIST Statistical Reference Datasets, https://www.itl.nist.gov/div898/strd/anova/anova.html.
"""

import math
import re
from pathlib import Path

import pytest
import scipy.stats

from sameline.stats import anova

FILES = sorted((Path(scipy.stats.__file__).parent / "tests" / "data" / "nist_anova").glob("*.dat"))


def read(path: Path) -> tuple[list[str], list[str], dict[str, float]]:
    lines = path.read_text(encoding="ascii").splitlines()
    rows = [line.split() for line in lines[60:] if line.strip()]
    table = "\n".join(lines[38:50])
    between, within = re.findall(r"^(?:Between|Within) \S+\s+(\d.*)$", table, re.MULTILINE)
    (r_squared,) = re.findall(r"Certified R-Squared\s+(\S+)", table)
    (sd,) = re.findall(r"Standard Deviation\s+(\S+)", table)
    names = ("df_between", "ss_between", "ms_between", "F", "df_within", "ss_within", "ms_within")
    certified = dict(zip(names, between.split() + within.split(), strict=True))
    certified |= {"eta_squared": r_squared, "residual_sd": sd}
    return [row[0] for row in rows], [row[-1] for row in rows], {k: float(v) for k, v in certified.items()}


def digits(got: float, want: float) -> float:
    """Log relative error: the number of correct digits, at most 15 (the certified values have no more)."""
    return 15.0 if got == want else min(15.0, -math.log10(abs(got - want) / abs(want)))


def test_there_are_eleven_sets():
    assert len(FILES) == 11


@pytest.mark.parametrize("as_doubles", [False, True], ids=["text", "doubles"])
@pytest.mark.parametrize("path", FILES, ids=[path.stem for path in FILES])
def test_certified_figures_are_reached(path: Path, as_doubles: bool):
    labels, values, certified = read(path)
    got = anova([float(value) for value in values] if as_doubles else values, labels)
    reached = {name: digits(getattr(got, name), want) for name, want in certified.items()}
    assert min(reached.values()) >= 14, reached
