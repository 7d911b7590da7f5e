"""`sameline conform` and `sameline capability`: answers by rule, refusals in words, and what they do not say."""

from __future__ import annotations

import pytest

BATCHES = [f"C-{n}" for n in range(1, 6)]


@pytest.fixture
def five(bench):
    """Five batches with two runs each; tensile strength about 20, at least 10."""
    for batch in BATCHES:
        bench.done("add", "batch", batch, "--material", "SEAL", "--supplier", "NORD")
    rows = [
        f"{batch},TS,2026-01-0{day}T08:00,{replicate},{20 + at * 0.5 + day * 0.1 + replicate * 0.05:.2f}"
        for at, batch in enumerate(BATCHES)
        for day in (5, 6)
        for replicate in (1, 2)
    ]
    bench.done("take", bench.file("five.csv", rows))
    return bench


def test_a_batch_well_inside_conforms_by_every_rule(five):
    told = five.done("conform", "C-3", "TS").out
    assert told.count("conforms") == 5
    assert "probability of conformity >0.9999" in told
    assert "not each piece" in told


def test_near_a_limit_the_rules_part(five):
    mean = five.done("conform", "C-1", "TS", "--json").document["measured"]
    five.done(
        "restate", "characteristic", "TS", "--lower", mean["estimate"] - mean["uncertainty"], "--reason", "tighter"
    )
    found = {a["rule"]: a["verdict"] for a in five.done("conform", "C-1", "TS", "--json").document["answers"]}
    assert found == {
        "simple acceptance": "conforms",
        "guarded acceptance": "does not conform",
        "guarded rejection": "conforms",
        "ISO 14253-1": "undecided",
        "JCGM 106": "undecided",
    }


def test_another_uncertainty_widens_the_guard_band(five):
    def guard(*more):
        (answer,) = five.done("conform", "C-1", "TS", "--rule", "ISO 14253-1", "--json", *more).document["answers"]
        return answer["guard"]

    assert guard("--other-uncertainty", 1.0) > guard() + 1.0


def test_capability_needs_five_batches_and_says_what_it_is(five, refused):
    told = five.done("capability", "NORD", "TS").out
    assert "performance, not capability" in told
    assert "5 batches are few" in told
    document = five.done("capability", "NORD", "TS", "--json").document
    assert [i["name"] for i in document["indices"]] == ["PpkL", "Ppk"]
    assert document["indices"][0]["lower"] < document["indices"][0]["value"] < document["indices"][0]["upper"]
    five.done("exclude", "--batch", "C-5", "--cause", "wrong specimen", "--reason", "mixed up")
    refused(five("capability", "NORD", "TS"), 2, "too little is known: 4 batches")


def test_what_is_safety_critical_says_that_it_releases_nothing(five):
    five.done("restate", "characteristic", "TS", "--safety-critical", "--reason", "used on brakes")
    for command in (("conform", "C-1", "TS"), ("capability", "NORD", "TS")):
        assert "releases no part" in five.done(*command).out


REFUSED = {
    "no result": (("conform", "B-3", "TS"), "no result of TS is recorded for B-3"),
    "no such batch": (("conform", "B-9", "TS"), "registered as 'B-9'"),
    "no such rule": (("conform", "B-1", "TS", "--rule", "fair"), "there is no rule 'fair'"),
    "no such probability": (("conform", "B-1", "TS", "--probability", 2), "limiting probability"),
    "a negative uncertainty": (("conform", "B-1", "TS", "--other-uncertainty", -1), "standard uncertainty"),
    "no such supplier": (("capability", "SUED", "TS"), "registered as 'SUED'"),
    "too few batches": (("capability", "NORD", "TS"), "too little is known"),
    "no such confidence": (("capability", "NORD", "TS", "--alpha", 3), "too little is known"),
}


@pytest.mark.parametrize("call", REFUSED)
def test_what_cannot_be_said_is_refused(unchanged, refused, call):
    arguments, words = REFUSED[call]
    refused(unchanged(*arguments), 2, words)


def test_without_a_limit_there_is_nothing_to_conform_to(bench, refused):
    bench.done("add", "characteristic", "EB", "--unit", "%")
    refused(bench("conform", "B-1", "EB"), 2, "EB has no specification limit")


def test_where_the_spread_of_runs_cannot_be_seen_it_is_refused(bench, refused):
    bench.done("log", "-b", "B-1", "-c", "TS", "12.1", "--at", "2026-01-05")
    refused(bench("conform", "B-1", "TS"), 2, "no replication at any level", "second run")
