"""The names in the documents that programs read: a change here breaks somebody's program."""

from __future__ import annotations

import pytest

PAIR = {
    "a", "b", "difference", "standard_error", "df", "statistic", "p_value", "lower", "upper", "differs", "verdict",
    "reason",
}  # fmt: skip
GROUP = {"label", "units", "runs", "replicates", "mean", "sd", "lower", "upper", "letters"}
QUESTION = {
    "revision", "characteristic", "name", "method", "unit", "limits", "margin", "grouping", "filter", "model",
    "procedure", "units", "alpha", "alternative", "looks", "safety_critical",
}  # fmt: skip
CONCLUSION = {
    "comparison", "version", "look", "recorded_at", "entry", "position", "person", "behind", "question", "causes",
    "turns", "inputs", "state", "reason", "runs", "replicates", "runs_before_statement", "display", "groups", "pairs",
    "components", "cautions", "test", "engine", "lines",
}  # fmt: skip
REGISTERED = {
    "batch": {"code", "material", "supplier", "supplier_lot", "received", "note"},
    "characteristic": {
        "code", "unit", "name", "method", "lower", "upper", "target", "margin", "decimals", "safety_critical", "note",
    },
    "supplier": {"code", "name", "note"},
    "material": {"code", "name", "note"},
    "instrument": {"code", "name", "note"},
    "person": {"code", "name", "role"},
}  # fmt: skip


def test_a_conclusion_holds_these_names(answered):
    document = answered.answer("pair")
    assert document.keys() >= CONCLUSION
    assert document["question"].keys() >= QUESTION
    assert document["groups"][0].keys() >= GROUP
    assert document["pairs"][0].keys() >= PAIR
    assert document["question"]["limits"] == {"lower": 10, "upper": None}
    assert {"level", "variance"} <= document["components"][0].keys()
    assert {"code", "text"} <= document["cautions"][0].keys()


def test_the_overview_and_the_history_hold_these_names(answered):
    (row,) = answered.done("differ", "--json").document
    assert row.keys() >= {
        "comparison", "behind", "version", "look", "recorded_at", "state", "reason", "pairs", "differ",
    }  # fmt: skip
    versions = answered.done("history", "pair", "--json").document
    assert [v["version"] for v in versions] == list(range(1, len(versions) + 1))
    assert versions[-1].keys() >= {
        "version", "look", "recorded_at", "entry", "person", "causes", "state", "reason", "turns", "pairs",
    }  # fmt: skip


def test_the_trail_the_runs_and_the_check_hold_these_names(answered):
    entry = answered.done("trail", "--json").document[-1]
    assert entry.keys() >= {"number", "at", "person", "act", "reason", "rows", "software", "digest"}
    run = answered.done("runs", "--json").document[-1]
    assert run.keys() == {
        "run", "batch", "characteristic", "tested_at", "analyst", "instrument", "session", "entry", "replicates",
    }  # fmt: skip
    assert run["replicates"][0].keys() == {
        "replicate", "text", "value", "qualifier", "unit", "amended", "excluded",
    }  # fmt: skip
    report = answered.done("verify", "--json").document
    assert report.keys() >= {"good", "entries", "rows", "conclusions", "root", "checks", "findings", "behind"}


@pytest.mark.parametrize("kind", REGISTERED)
def test_a_list_holds_these_names(bench, kind):
    bench.done("add", "instrument", "RIG-1")
    rows = bench.done("list", kind, "--json").document
    assert rows[0].keys() == REGISTERED[kind]


ACTS = {
    "log": ("log", "-b", "B-1", "-c", "TS", "12.0", "--at", "2026-01-08"),
    "amend": ("amend", "12.2", "--run", 1, "--replicate", 1, "--reason", "slip"),
    "exclude": ("exclude", "--run", 1, "--cause", "specimen damaged", "--reason", "nick"),
    "compare": ("compare", "pair", "B-1", "B-2", "-c", "TS", "--alpha", 0.1),
}


@pytest.mark.parametrize("act", ACTS)
def test_an_act_tells_its_entry_and_what_it_changed(answered, act):
    document = answered.done(*ACTS[act], "--json").document
    assert document.keys() == {"entry", "runs", "comparisons"}
    assert document["comparisons"][0].keys() == {"comparison", "version", "change"}
    assert document["runs"] == ([5] if act == "log" else [])


def test_every_file_taken_in_is_one_document(answered):
    first = answered.file("a.csv", ["B-1,TS,2026-02-01,1,12.0"])
    second = answered.file("b.csv", ["B-2,TS,2026-02-01,1,16.0"])
    documents = answered.done("take", first, second, "--json").document
    assert [document["runs"] for document in documents] == [[5], [6]]
    checked = answered.done("take", answered.file("c.csv", ["B-1,TS,2026-03-01,1,12.0"]), "--check", "--json").document
    assert checked == {"runs": 1, "recorded_already": [], "findings": []}
