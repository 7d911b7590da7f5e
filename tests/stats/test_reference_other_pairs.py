"""Games-Howell, Dunnett, Welch pairs and the rank procedures against the reference cases.

Tolerances are those of tests/reference/README.md.
"""

from collections.abc import Callable
from typing import Any

import numpy as np

from sameline.stats import PairsResult, compare_pairs, equivalent_pairs

Case = dict[str, Any]
Near = Callable[..., None]


def compared(case: Case, procedure: str) -> PairsResult:
    data, options = case["data"], case["options"]
    extra = {name: options[name] for name in ("control", "alternative") if name in options}
    return compare_pairs(data["value"], data["group"], procedure=procedure, alpha=options["alpha"], **extra)


def test_games_howell(games_howell_case: Case, near: Near, rtol_of: Callable[[Case], float]):
    pairs, rtol = games_howell_case["expect"]["pairs"], rtol_of(games_howell_case)
    got = compared(games_howell_case, "games-howell")
    frame, se = got.frame(), np.asarray(pairs["se"])
    near(frame["difference"], pairs["diff"], rtol=rtol, label="difference")
    near(frame["standard_error"], se, rtol=rtol, label="se")
    near(frame["df"], pairs["df"], rtol=rtol, label="df")
    near(frame["statistic"], pairs["q"], rtol=rtol, label="q")
    near(frame["p_value"], pairs["p"], atol=1e-9, label="p")
    near(got.columns.critical, pairs["q_crit"], rtol=1e-9, label="critical")
    near(frame["lower"] / se, np.asarray(pairs["lo"]) / se, atol=10 * rtol, label="lower")
    near(frame["upper"] / se, np.asarray(pairs["hi"]) / se, atol=10 * rtol, label="upper")


def test_dunnett(dunnett_case: Case, near: Near, rtol_of: Callable[[Case], float]):
    want, rtol = dunnett_case["expect"], rtol_of(dunnett_case)
    pairs = want["comparisons"]
    got = compared(dunnett_case, "dunnett")
    assert (list(got.a), list(got.b)) == (pairs["control"], pairs["group"])
    frame, se = got.frame(), np.asarray(pairs["se"])
    near(got.critical_value, want["critical_value"], rtol=1e-9, label="critical")
    near(frame["df"], [want["df"]] * len(frame), label="df")
    near(frame["difference"], pairs["diff"], rtol=rtol, label="difference")
    near(frame["standard_error"], se, rtol=rtol, label="se")
    near(frame["statistic"], pairs["t"], rtol=rtol, label="t")
    near(frame["p_value"], pairs["p"], atol=1e-9, label="p")
    near(frame["lower"] / se, np.asarray(pairs["lo"], float) / se, atol=10 * rtol, label="lower")
    near(frame["upper"] / se, np.asarray(pairs["hi"], float) / se, atol=10 * rtol, label="upper")


def test_welch_holm(pairs_welch_holm_case: Case, near: Near, rtol_of: Callable[[Case], float]):
    pairs, rtol = pairs_welch_holm_case["expect"]["pairs"], rtol_of(pairs_welch_holm_case)
    got = compared(pairs_welch_holm_case, "welch-holm")
    frame = got.frame()
    near(frame["difference"], pairs["diff"], rtol=rtol, label="difference")
    near(frame["standard_error"], pairs["se"], rtol=rtol, label="se")
    near(frame["df"], pairs["df"], rtol=rtol, label="df")
    near(frame["statistic"], pairs["t"], rtol=rtol, label="t")
    near(got.columns.p_raw, pairs["p_raw"], rtol=10 * rtol, label="p_raw")
    near(frame["p_value"], pairs["p"], rtol=10 * rtol, label="p")
    assert got.critical_value is None
    assert set(frame["lower"]) == {None}


def test_dunn(dunn_holm_case: Case, near: Near):
    pairs = dunn_holm_case["expect"]["pairs"]
    got = compared(dunn_holm_case, "dunn")
    near(got.columns.details["mean_rank_difference"], pairs["mean_rank_diff"], atol=1e-10, label="rank difference")
    near(got.columns.statistic, pairs["z"], atol=1e-10, label="z")
    near(got.columns.p_raw, pairs["p_raw"], atol=1e-10, label="p_raw")
    near(got.columns.p_value, pairs["p"], atol=1e-10, label="p")


def test_steel_dwass(steel_dwass_case: Case, near: Near):
    want, pairs = steel_dwass_case["expect"], steel_dwass_case["expect"]["pairs"]
    got = compared(steel_dwass_case, "steel-dwass")
    near(got.critical_value, want["q_crit"], rtol=1e-9, label="critical")
    near(got.columns.details["z"], pairs["z"], atol=1e-10, label="z")
    near(got.columns.statistic, pairs["q"], atol=1e-10, label="q")
    near(got.columns.p_value, pairs["p"], atol=1e-9, label="p")


def test_equivalence(equivalence_case: Case, near: Near, rtol_of: Callable[[Case], float]):
    data, options, want = equivalence_case["data"], equivalence_case["options"], equivalence_case["expect"]
    rtol = rtol_of(equivalence_case)
    single, together = want["per_pair"], want["simultaneous"]
    got = equivalent_pairs(data["value"], data["group"], options["margin"], alpha=options["alpha"])
    frame, se = got.frame(), np.asarray(single["pairs"]["se"])
    near([got.df, got.t_critical, got.q_critical], [want["df"], single["t_crit"], together["q_crit"]], rtol=1e-9)
    near(frame["difference"], single["pairs"]["diff"], rtol=rtol, label="difference")
    near(frame["standard_error"], se, rtol=rtol, label="se")
    near(frame["p_value"], single["pairs"]["p_tost"], rtol=10 * rtol, label="p")
    for name, table, key in (
        ("lower", single, "lo"),
        ("upper", single, "hi"),
        ("simultaneous_lower", together, "lo"),
        ("simultaneous_upper", together, "hi"),
    ):
        near(frame[name] / se, np.asarray(table["pairs"][key]) / se, atol=10 * rtol, label=name)
    assert frame["equivalent"].tolist() == single["pairs"]["equivalent"]
    assert frame["simultaneously_equivalent"].tolist() == together["pairs"]["equivalent"]
