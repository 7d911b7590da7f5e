"""Heading maps from the command line: proposed in words, kept when a person says so, and read with."""

from __future__ import annotations

import json
import sys

import pytest

from sameline.cli import run

HEAD = "Probe;Datum;Prüfer;Härte [degree];Bemerkung"
ROWS = ("B1;21.02.2026;ana;70,5;", "B1;21.02.2026;ana;70,7;", "B2;22.02.2026;ben;70,1;second drum")


@pytest.fixture
def call(sqlite_store, monkeypatch, capsys, tmp_path):
    monkeypatch.setenv("SAMELINE_STORE", sqlite_store)
    monkeypatch.setenv("SAMELINE_BY", "ben")
    monkeypatch.chdir(tmp_path)

    def called(*words, code=0):
        assert run([str(word) for word in words]) == code, capsys.readouterr()
        return capsys.readouterr()

    return called


@pytest.fixture
def export(tmp_path):
    path = tmp_path / "export.csv"
    path.write_text("\n".join([HEAD, *ROWS]) + "\n", encoding="utf-8")
    return path


def kept_maps(call, *options):
    """Those that were not in the store before."""
    return [m for m in json.loads(call("map", "list", "--json", *options).out) if m["name"] != "drum list"]


RIG = ("--name", "durometer", "--column", "Härte [degree]=value:hardness", "--column", "Bemerkung=note")


def test_a_proposal_is_shown_and_not_kept(call, export):
    call("take", export, code=1)
    shown = call("map", "propose", export, *RIG)
    for words in ("headings in row 1", "Probe", "batch", "values of hardness in degree", "decimal sign"):
        assert words in shown.out
    assert "dates are day, month, year" in call("map", "propose", export, *RIG, "--dates", "dmy").out
    assert "not kept" in shown.err
    assert kept_maps(call) == []
    call("take", export, code=1)


def test_a_kept_map_is_read_with_and_stands_in_the_trail(call, export):
    kept = call("map", "propose", export, *RIG, "--keep")
    assert "map 'durometer' kept, entry" in kept.err
    (listed,) = kept_maps(call)
    assert {c["heading"]: c["field"] for c in listed["columns"]} == {
        "Probe": "batch",
        "Datum": "tested_at",
        "Prüfer": "analyst",
        "Härte [degree]": "value",
        "Bemerkung": "note",
    }
    assert "Härte [degree]: values of hardness in degree" in call("map", "list").out
    entry = json.loads(call("trail", "--json").out)[-1]
    assert (entry["number"], entry["act"]) == (listed["entry"], "map")
    assert "map durometer" in call("trail", "--last", "1").out
    assert "taken in" in call("take", export, "--as-they-stand").err
    newest = json.loads(call("runs", "--batch", "B1", "--last", "1", "--json").out)[-1]
    assert [m["text"] for m in newest["replicates"]] == ["70,5", "70,7"]
    call("verify")


def test_a_map_that_does_not_say_all_is_not_kept(call, export):
    shown = call("map", "propose", export, "--name", "x", "--keep", "--column", "Datum=ignore", code=2)
    assert "NOT SAID YET: " in shown.out
    assert "tested_at" in shown.err
    assert kept_maps(call) == []


def test_a_constant_fills_what_no_column_says(call, export):
    words = ("--column", "Prüfer=ignore", "--constant", "analyst=ana")
    call("map", "propose", export, *RIG, *words, "--keep")
    call("take", export, "--as-they-stand")
    newest = json.loads(call("runs", "--batch", "B2", "--last", "1", "--json").out)[-1]
    assert newest["analyst"] == "ana"


def test_the_map_kept_last_under_a_name_holds_and_the_one_before_stays_readable(call, export):
    call("map", "propose", export, *RIG, "--keep")
    (first,) = kept_maps(call)
    assert "kept already as 'durometer'" in call("map", "propose", export, *RIG, "--keep", code=2).err
    call("map", "propose", export, *RIG, "--keep", "--column", "Bemerkung=ignore")
    (second,) = kept_maps(call)
    assert second["entry"] > first["entry"]
    assert second["columns"] != first["columns"]
    assert kept_maps(call, "--as-of", first["entry"]) == [first]


def test_where_two_maps_fit_one_is_named(call, export):
    call("map", "propose", export, *RIG, "--keep")
    call("map", "propose", export, *RIG, "--column", "Bemerkung=ignore", "--name", "other", "--keep")
    assert "several maps fit" in call("take", export, code=1).err
    call("take", "--check", export, "--map", "other")
    assert "no heading map is kept as 'ghost'" in call("take", export, "--map", "ghost", code=2).err


@pytest.mark.parametrize(("answer", "kept"), [(True, 1), (False, 0)])
def test_on_a_terminal_a_person_is_asked(call, export, monkeypatch, answer, kept):
    monkeypatch.setattr(sys.stdin, "isatty", lambda: True, raising=False)
    monkeypatch.setattr("typer.confirm", lambda *_, **__: answer)
    call("map", "propose", export, *RIG)
    assert len(kept_maps(call)) == kept


@pytest.mark.parametrize(
    ("words", "says"),
    [
        (("--column", "Ghost=batch"), "there is no column 'Ghost'"),
        (("--column", "Probe"), "is not of the form name=value"),
        (("--column", "Probe=lot"), "unknown field 'lot'"),
        (("--dates", "dym"), "is no order of dates"),
        (("--name", " "), "needs a name"),
    ],
)
def test_what_cannot_be_meant_is_refused(call, export, words, says):
    assert says in call("map", "propose", export, *RIG, *words, "--keep", code=2).err
