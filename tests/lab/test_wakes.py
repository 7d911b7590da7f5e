"""Which act brings which comparison up to date: each line of `sameline.lab.WAKES`, held to what happens."""

from __future__ import annotations

import shutil
from collections.abc import Callable, Iterator
from pathlib import Path

import pytest

import laboratory
from laboratory import moment, run, source, statement
from sameline.lab import WAKES, Lab, Outcome, open_lab

COMPARISONS = {
    "all": {},
    "alder": {"of_supplier": "ALDER"},
    "compound 80": {"of_material": "RC80"},
    "later": {"tested_from": moment(10)},
    "one and two": {"groups": ("B1", "B2")},
    "suppliers": {"grouping": "supplier"},
    "birch alone": {"grouping": "material", "of_supplier": "BIRCH"},
    "own margin": {"margin": 3.0},
    "set": {"characteristic": "set"},
}
EVERY_HARDNESS = frozenset({"all", "suppliers", "own margin"})


@pytest.fixture(scope="module")
def asked_template(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """All comparisons stated; B1 tested early, B3 late; B4 and B2 not."""
    path = tmp_path_factory.mktemp("template") / "asked.db"
    with laboratory.bare(str(path)) as lab:
        for name, parts in COMPARISONS.items():
            lab.compare(statement(name, **parts))
        lab.record([run("B1", 5, "70.1", "70.2")])
        lab.record([run("B3", 12, "72.1", "72.2")])
    return path


@pytest.fixture
def asked(asked_template: Path, tmp_path: Path) -> Iterator[Lab]:
    shutil.copy(asked_template, tmp_path / "asked.db")
    with open_lab(tmp_path / "asked.db", by="ana") as lab:
        yield lab


def awoken(outcome: Outcome) -> set[str]:
    assert outcome.behind == ()
    return {conclusion.name for conclusion in outcome.conclusions}


def exclude(lab: Lab, **what: int) -> Outcome:
    return lab.exclude("instrument fault", reason="worn", **what)


def put_back(lab: Lab, **what: int) -> Outcome:
    exclude(lab, **what)
    return lab.restore(reason="not worn", **what)


def last_entry(lab: Lab, act: str) -> int:
    return [entry.number for entry in lab.trail() if entry.act == act][-1]


def first_entry(lab: Lab, act: str) -> int:
    return next(entry.number for entry in lab.trail() if entry.act == act)


def amend(lab: Lab, number: int) -> Outcome:
    return lab.amend(lab.find_measurements(number, 1)[0], laboratory.replicate(1, "71.0"), reason="a slip")


EARLY = EVERY_HARDNESS | {"alder", "one and two"}  # where a run of B1, early, falls
LATE = EVERY_HARDNESS | {"later", "birch alone"}  # where a run of B3, late, falls

CASES: list[tuple[str, str, Callable[[Lab], Outcome], frozenset[str]]] = [
    ("add", "a supplier", lambda lab: lab.add("supplier", "NEW", name="x"), frozenset()),
    ("add", "a batch", lambda lab: lab.add("batch", "B9", material="RC70", supplier="ALDER"), frozenset()),
    ("log", "early", lambda lab: lab.record([run("B1", 6, "70.0")]), EARLY),
    ("log", "late", lambda lab: lab.record([run("B3", 13, "72.0")]), LATE),
    ("log", "late of a listed batch", lambda lab: lab.record([run("B2", 13, "72.0")]), EARLY | {"later"}),
    ("log", "on the very moment", lambda lab: lab.record([run("B4", 10, "72.0")]), LATE),
    ("log", "another characteristic", lambda lab: lab.record([run("B1", 6, "9", characteristic="set")]), {"set"}),
    (
        "take",
        "runs of both",
        lambda lab: lab.record([run("B1", 6, "70.0"), run("B3", 13, "72.0")], source("f.csv")),
        EARLY | LATE,
    ),
    ("amend", "an early value", lambda lab: amend(lab, 1), EARLY),
    ("amend", "a late value", lambda lab: amend(lab, 2), LATE),
    ("amend", "a run's batch", lambda lab: lab.amend_run(2, batch="B2", reason="x"), LATE | {"alder", "one and two"}),
    ("reverse", "an early run", lambda lab: lab.reverse(first_entry(lab, "log"), reason="x"), EARLY),
    ("reverse", "a late run", lambda lab: lab.reverse(last_entry(lab, "log"), reason="x"), LATE),
    ("exclude", "a replicate", lambda lab: exclude(lab, measurement=1), EARLY),
    ("exclude", "a run", lambda lab: exclude(lab, run=2), LATE),
    ("exclude", "a batch", lambda lab: exclude(lab, batch=3), LATE),
    ("exclude", "a batch without runs", lambda lab: exclude(lab, batch=4), frozenset()),
    ("restore", "a replicate", lambda lab: put_back(lab, measurement=3), LATE),
    ("restore", "a run", lambda lab: put_back(lab, run=1), EARLY),
    ("restore", "a batch", lambda lab: put_back(lab, batch=1), EARLY),
    ("compare", "a new one", lambda lab: lab.compare(statement("another")), {"another"}),
    ("compare", "anew", lambda lab: lab.compare(statement("all", alpha=0.01)), {"all"}),
    (
        "restate batch",
        "its supplier",
        lambda lab: lab.restate("batch", "B3", supplier="ALDER", reason="the note"),
        LATE | {"alder"},
    ),
    (
        "restate batch",
        "its material",
        lambda lab: lab.restate("batch", "B1", material="RC80", reason="the note"),
        EARLY | {"compound 80"},
    ),
    (
        "restate batch",
        "one without runs",
        lambda lab: lab.restate("batch", "B4", supplier="ALDER", reason="the note"),
        frozenset(),
    ),
    (
        "restate characteristic",
        "its margin",
        lambda lab: lab.restate("characteristic", "hardness", margin=1.0, reason="the drawing"),
        COMPARISONS.keys() - {"own margin", "set"},
    ),
    ("restate supplier", "its name", lambda lab: lab.restate("supplier", "ALDER", name="A", reason="x"), frozenset()),
    ("restate person", "a role", lambda lab: lab.restate("person", "ben", role="head", reason="x"), frozenset()),
]


@pytest.mark.parametrize(("act", "what", "do", "expected"), CASES, ids=[f"{act}: {what}" for act, what, *_ in CASES])
def test_what_an_act_awakens(asked: Lab, act: str, what: str, do: Callable[[Lab], Outcome], expected: frozenset[str]):
    outcome = do(asked)
    assert awoken(outcome) == expected, what
    (entry,) = (entry for entry in asked.trail() if entry.number == outcome.entry)
    assert entry.act.startswith(act)
    assert all(conclusion.causes == (outcome.entry,) for conclusion in outcome.conclusions if act != "restore")
    assert (WAKES.get(act, "nothing") == "nothing") == (act in {"add", "restate supplier", "restate person"})
    found = asked.verify()
    assert (found.findings, found.behind) == ((), ())


def test_each_line_is_held():
    assert {act for act, *_ in CASES} >= WAKES.keys() - {"init", "conclude"}


def test_making_a_store_and_concluding_awaken_nothing(asked: Lab):
    concluded = [entry for entry in asked.trail() if entry.act in {"init", "conclude"}]
    assert all(set(entry.rows).isdisjoint({"comparison_touch"}) for entry in concluded)
    assert asked.catch_up().conclusions == ()
