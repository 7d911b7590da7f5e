"""The scenario's form: what the tour relies on, and that the committed files are what the script makes."""

from __future__ import annotations

import datetime as dt
import re
import subprocess
import sys
from pathlib import Path
from typing import TYPE_CHECKING

import pandas as pd
import pint

if TYPE_CHECKING:
    from tests.seed.conftest import Recorded

ACTS = {
    "init": {"laboratory", "person"},
    "add": set(),
    "compare": {"name", "characteristic", "grouping", "procedure", "model", "looks", "alpha"},
    "take": {"file", "runs", "replicates"},
    "differ": {"name"},
    "history": {"name"},
    "amend": {"batch", "characteristic", "tested_at", "replicate", "recorded", "value", "reason"},
    "trail": {"batch"},
    "verify": set(),
}
COLUMNS = ["batch", "characteristic", "tested_at", "analyst", "instrument", "session", "replicate", "value"]


def files(recorded: Recorded):
    return {
        s["file"]: pd.read_csv(recorded.folder / s["file"], dtype=str) for s in recorded.steps if s["act"] == "take"
    }


def test_making_it_again_gives_the_same_bytes(tmp_path: Path, seed_folder: Path):
    subprocess.run([sys.executable, seed_folder / "make_scenario.py", tmp_path], check=True)
    made = {path.relative_to(tmp_path): path.read_bytes() for path in tmp_path.rglob("*") if path.is_file()}
    kept = {Path("runs", path.name): path.read_bytes() for path in (seed_folder / "runs").iterdir()}
    kept[Path("scenario.json")] = (seed_folder / "scenario.json").read_bytes()
    assert made == kept


def test_every_step_says_who_when_what_and_has_its_parts(recorded: Recorded):
    people = {"brastaryd"}
    for step in recorded.steps:
        people |= {person["code"] for person in step.get("persons", ())}
        assert ACTS[step["act"]] <= step.keys()
        assert step["by"] in people
        assert 10 < len(step["say"]) < 400
        assert "\n" not in step["say"]


def test_steps_stand_in_order_of_time(recorded: Recorded):
    moments = [dt.datetime.fromisoformat(step["at"]) for step in recorded.steps]
    assert all(moment.utcoffset() == dt.timedelta(hours=1) for moment in moments)
    assert moments == sorted(moments)
    assert len(set(moments)) == len(moments)


def test_it_is_small_enough_for_a_quick_tour_and_large_enough_to_tell_something(recorded: Recorded):
    tables = files(recorded)
    rows = pd.concat(tables.values())
    runs = rows.groupby(["batch", "characteristic", "tested_at"])
    assert 12 <= len(tables) <= 18
    assert 60 <= runs.ngroups <= 120
    assert len(rows) < 700
    assert runs.size().between(3, 6).all()
    assert (rows.groupby(["batch", "characteristic"])["tested_at"].nunique() >= 2).all()
    assert (rows.groupby(["batch", "characteristic"])["session"].nunique() >= 2).mean() > 0.75
    assert (rows.groupby("session")["batch"].nunique() >= 2).all()


def test_files_are_tidy_and_complete(recorded: Recorded):
    on_disk = {f"runs/{path.name}" for path in (recorded.folder / "runs").iterdir()}
    tables = files(recorded)
    assert on_disk == tables.keys()
    seen = pd.concat(tables.values())
    assert not seen.duplicated(["batch", "characteristic", "tested_at", "replicate"]).any()
    for step in (s for s in recorded.steps if s["act"] == "take"):
        rows = tables[step["file"]]
        runs = rows.groupby(["batch", "characteristic", "tested_at"], sort=False)
        assert list(rows.columns) == COLUMNS
        assert (step["runs"], step["replicates"]) == (runs.ngroups, len(rows))
        assert not rows.isna().any(axis=None)
        assert len(rows.drop_duplicates(COLUMNS[:6])) == runs.ngroups
        assert all(list(part) == [str(i + 1) for i in range(len(part))] for _, part in runs["replicate"])
        assert (rows["tested_at"].str[:10] == rows["session"]).all()
        assert (rows["tested_at"].map(dt.datetime.fromisoformat) < dt.datetime.fromisoformat(step["at"])).all()


def test_an_analyst_tests_one_thing_at_a_time(recorded: Recorded):
    runs = pd.concat(files(recorded).values()).drop_duplicates(["batch", "characteristic", "tested_at"])
    assert not runs.duplicated(["analyst", "tested_at"]).any()
    assert not runs.duplicated(["instrument", "tested_at"]).any()


def test_values_carry_the_decimals_of_their_characteristic(recorded: Recorded):
    rows = pd.concat(files(recorded).values())
    decimals = rows["characteristic"].map(recorded.registered("characteristics")["decimals"])
    assert all(re.fullmatch(rf"\d+\.\d{{{d}}}", text) for text, d in zip(rows["value"], decimals, strict=True))


def test_everything_is_registered_before_it_is_used(recorded: Recorded):
    known = {"analyst": set(), "instrument": set(), "batch": set(), "characteristic": set()}
    kinds = {"analyst": "persons", "instrument": "instruments", "batch": "batches", "characteristic": "characteristics"}
    others = {"supplier": set(), "material": set()}
    for step in recorded.steps:
        for column, kind in kinds.items():
            known[column] |= {item["code"] for item in step.get(kind, ())}
        for column in others:
            others[column] |= {item["code"] for item in step.get(f"{column}s", ())}
        for batch in step.get("batches", ()):
            assert {batch["supplier"]} <= others["supplier"]
            assert {batch["material"]} <= others["material"]
            assert batch["received"] <= step["at"][:10]
        if step["act"] == "compare":
            groups = others.get(step["grouping"], known["batch"])
            assert set(step.get("groups", ())) <= groups
            assert step["characteristic"] in known["characteristic"]
        if step["act"] == "take":
            rows = pd.read_csv(recorded.folder / step["file"], dtype=str)
            assert all(set(rows[column]) <= known[column] for column in known)


def test_every_question_is_asked_before_its_first_result(recorded: Recorded):
    rows = recorded.after(len(recorded.steps) - 1)
    for step in (s for s in recorded.steps if s["act"] == "compare"):
        assert step["at"][:10] < recorded.scope(step["name"], rows)["session"].min()


def test_no_result_falls_outside_every_question(recorded: Recorded):
    rows = recorded.after(len(recorded.steps) - 1)
    names = [s["name"] for s in recorded.steps if s["act"] == "compare"]
    assert sum(len(recorded.scope(name, rows)) for name in names) == len(rows)


def test_characteristics_are_standard_tests_with_a_unit_a_margin_and_a_caution(recorded: Recorded):
    characteristics = recorded.registered("characteristics")
    assert sorted(method.split(",")[0] for method in characteristics["method"]) == ["ISO 37", "ISO 48-4", "ISO 815-1"]
    for code, facts in characteristics.iterrows():
        if code == "HARD":
            assert facts["unit"] == "Shore A"  # a scale that ISO 48-4 defines; the units library knows none
        else:
            pint.UnitRegistry().Unit(facts["unit"])
        assert facts["note"].startswith("Caution: ")
        assert float(facts["margin"]) > 0


def test_the_amendment_restores_the_swapped_digits(recorded: Recorded):
    (amend,) = (s for s in recorded.steps if s["act"] == "amend")
    assert (amend["recorded"], amend["value"]) == ("81.2", "18.2")
    assert amend["reason"]
