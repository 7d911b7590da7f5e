"""Every wrong call by name: a clear message that says what to do, the right exit code, and nothing written."""

from __future__ import annotations

import pytest

LOG = ("log", "-b", "B-1", "-c", "TS", "--at", "2026-02-01")

CALLS = {
    "an unknown batch": (
        ("log", "-b", "B-7", "-c", "TS", "12.5"),
        1,
        ("batch 'B-7' is not registered", "did you mean 'B-"),
    ),
    "an unknown characteristic": (
        ("log", "-b", "B-1", "-c", "TD", "12.5"),
        1,
        ("characteristic 'TD' is not registered", "did you mean 'TS'?"),
    ),
    "an unknown person": ((*LOG, "12.5", "--by", "nobody"), 1, ("person 'nobody' is not registered",)),
    "nobody acting": (("add", "supplier", "WEST", "--by", ""), 2, ("no person is registered as ''", "mira")),
    "a unit that nobody knows": (
        ("add", "characteristic", "HD", "--unit", "shure"),
        2,
        ("'shure' is not a unit known here", "Shore A"),
    ),
    "text for a value": ((*LOG, "12.5", "strong"), 1, ("replicate 2: 'strong' is text, not a figure",)),
    "no values": (LOG, 2, ("the values must be given", "--help")),
    "not a number for a value": ((*LOG, "nan"), 1, ("'nan'",)),
    "a misspelt option among values": ((*LOG, "12.5", "--sesion"), 2, ("there is no option --sesion",)),
    "a date in the future": (
        ("log", "-b", "B-1", "-c", "TS", "--at", "2999-01-01", "12.5"),
        1,
        ("is in the future", "the day it was tested"),
    ),
    "a date that is none": (("log", "-b", "B-1", "-c", "TS", "--at", "2026-02-30", "12.5"), 1, ("2026-02-30",)),
    "a run recorded twice": (
        ("log", "-b", "B-1", "-c", "TS", "--at", "2026-01-05T08:00", "12.5"),
        1,
        ("is recorded already", "amend"),
    ),
    "a comparison with one group": (
        ("compare", "alone", "B-1", "-c", "TS"),
        2,
        ("needs at least two groups", "list another"),
    ),
    "a group listed twice": (("compare", "twice", "B-1", "B-1", "-c", "TS"), 2, ("group 'B-1' is listed twice",)),
    "a group that is not registered": (
        ("compare", "ghost", "B-1", "B-8", "-c", "TS"),
        2,
        ("no batch is registered as 'B-8'", "did you mean 'B-"),
    ),
    "a comparison without a name": (("compare", " ", "B-1", "B-2", "-c", "TS"), 2, ("needs a name",)),
    "alpha of zero": (("compare", "x", "-c", "TS", "--alpha", 0), 2, ("alpha is 0", "between 0 and 1")),
    "alpha of one": (("compare", "x", "-c", "TS", "--alpha", 1), 2, ("alpha is 1", "between 0 and 1")),
    "alpha in per cent": (("compare", "x", "-c", "TS", "--alpha", 5), 2, ("alpha is 5", "for example 0.05")),
    "alpha that is no number": (("compare", "x", "-c", "TS", "--alpha", "nan"), 2, ("alpha is nan", "between 0 and 1")),
    "a margin below zero": (("compare", "x", "-c", "TS", "--margin", -1), 2, ("the margin is -1", "above 0")),
    "a model that does not offer the procedure": (
        ("compare", "x", "-c", "TS", "--model", "ranks", "--procedure", "holm"),
        2,
        ("does not offer holm", "steel-dwass"),
    ),
    "a control that is no group": (
        ("compare", "x", "B-1", "B-2", "-c", "TS", "--control", "B-3"),
        2,
        ("is not among the groups", "list it too"),
    ),
    "a supplier's name taken": (
        ("add", "supplier", "NORD"),
        2,
        ("a supplier is registered as 'NORD' already", "`sameline list supplier`"),
    ),
    "a batch's name taken": (
        ("add", "batch", "B-1", "--material", "SEAL", "--supplier", "NORD"),
        2,
        ("registered as 'B-1' already",),
    ),
    "an empty code": (("add", "material", " "), 2, ("is not a code", "at least one")),
    "a batch of an unknown material": (
        ("add", "batch", "B-9", "--material", "SEEL", "--supplier", "NORD"),
        2,
        ("'SEEL'", "did you mean 'SEAL'?"),
    ),
    "a day that is none": (
        ("add", "batch", "B-9", "--material", "SEAL", "--supplier", "NORD", "--received", "5.1.2026"),
        2,
        ("'5.1.2026' is not a day", "2026-03-04"),
    ),
    "limits the wrong way round": (
        ("add", "characteristic", "HD", "--unit", "1", "--lower", 9, "--upper", 8),
        2,
        ("not below the upper limit",),
    ),
    "nothing to restate": (("restate", "batch", "B-1", "--reason", "so"), 2, ("nothing to state anew",)),
    "no such comparison": (("differ", "trio"), 2, ("no comparison is called 'trio'", "`sameline differ`")),
    "no such version": (("differ", "pair", "--version", 99), 2, ("there is no version 99", "`sameline history NAME`")),
    "no such moment": (("differ", "pair", "--as-of", "2001-01-01"), 2, ("nothing had been recorded by 2001-01-01",)),
    "a moment that is none": (("trail", "--since", "yesterday"), 2, ("'yesterday' is not a date or time",)),
    "no such run to amend": (
        ("amend", "12", "--run", 77, "--replicate", 1, "--reason", "slip"),
        2,
        ("there is no run 77", "`sameline runs`"),
    ),
    "text as an amendment": (
        ("amend", "strong", "--run", 1, "--replicate", 1, "--reason", "slip"),
        1,
        ("'strong' is text, not a figure",),
    ),
    "an amendment to the same value": (
        ("amend", "12.1", "--run", 1, "--replicate", 1, "--reason", "slip"),
        2,
        ("12.1 already; nothing to amend",),
    ),
    "an amendment without a reason": (
        ("amend", "12.2", "--run", 1, "--replicate", 1),
        2,
        ("Missing option '--reason'",),
    ),
    "an amendment with an empty reason": (
        ("amend", "12.2", "--run", 1, "--replicate", 1, "--reason", " "),
        2,
        ("the reason is empty", "audit trail"),
    ),
    "a cause that is none": (
        ("exclude", "--run", 1, "--cause", "too high", "--reason", "so"),
        2,
        ("not an assignable cause", "specimen damaged"),
    ),
    "nothing to put back": (("restore", "--run", 1, "--reason", "so"), 2, ("it is not set aside",)),
    "no such kind": (("list", "ovens"), 2, ("nothing is registered as 'ovens'", "instrument")),
    "a file that is not there": (("take", "results.csv"), 2, ("there is no such file", "check the name")),
    "a folder for a file": (("take", "."), 2, ("this is a folder", "name the files in it")),
}


@pytest.mark.parametrize("case", CALLS)
def test_a_wrong_call_is_refused_and_nothing_is_written(unchanged, refused, case):
    arguments, code, words = CALLS[case]
    refused(unchanged(*arguments), code, *words)
