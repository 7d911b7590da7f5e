"""The table of pair procedures: what each is called, what it assumes, and where it is computed."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

from sameline.errors import StatsError
from sameline.stats.adjusted import bonferroni, holm, sidak, welch_holm
from sameline.stats.columns import Columns, Question
from sameline.stats.dunn import dunn
from sameline.stats.dunnett import dunnett
from sameline.stats.games_howell import games_howell
from sameline.stats.steel_dwass import steel_dwass
from sameline.stats.tukey_kramer import tukey_kramer

COMMON, UNEQUAL, RANKS = "common variance", "unequal variances", "ranks"
ALTERNATIVES = ("two-sided", "less", "greater")


@dataclass(frozen=True, slots=True)
class Procedure:
    """One pair procedure.

    Args:
        name: as it is called in `compare_pairs` and on the command line.
        compute: the function behind it.
        family: "common variance", "unequal variances" or "ranks".
        statistic: what its statistic is: "q" (studentized range, at least 0), "t" or "z" (signed).
        control: "none" (all pairs only), "needed" (pairs with a control only) or "either".
        intervals: whether it has simultaneous intervals; without them no margin can be judged.
    """

    name: str
    compute: Callable[[Question], Columns]
    family: str
    statistic: str
    control: str
    intervals: bool


PROCEDURES = (
    Procedure("tukey-kramer", tukey_kramer, COMMON, "q", "none", intervals=True),
    Procedure("games-howell", games_howell, UNEQUAL, "q", "none", intervals=True),
    Procedure("dunnett", dunnett, COMMON, "t", "needed", intervals=True),
    Procedure("bonferroni", bonferroni, COMMON, "t", "either", intervals=True),
    Procedure("holm", holm, COMMON, "t", "either", intervals=False),
    Procedure("sidak", sidak, COMMON, "t", "either", intervals=True),
    Procedure("welch-holm", welch_holm, UNEQUAL, "t", "either", intervals=False),
    Procedure("steel-dwass", steel_dwass, RANKS, "q", "none", intervals=True),
    Procedure("dunn", dunn, RANKS, "z", "either", intervals=False),
)


def find_procedure(name: str) -> Procedure:
    """The procedure of this name.

    Raises:
        StatsError: there is none of this name.
    """
    for procedure in PROCEDURES:
        if procedure.name == name:
            return procedure
    raise StatsError(
        f"there is no procedure {name!r}",
        where="procedure",
        advice="choose one of " + ", ".join(procedure.name for procedure in PROCEDURES),
    )
