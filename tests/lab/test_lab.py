"""A laboratory through its Python face: what holds, what was known when, and what is caught up."""

from __future__ import annotations

import pytest

import laboratory
from laboratory import replicate, run, source, statement
from sameline.errors import CallError, SamelineError
from sameline.lab import Lab, open_lab
from sameline.lab import laboratory as acts
from sameline.records import registry


def values(lab: Lab, as_of: int | str | None = None) -> list[tuple[int, str, str | None]]:
    """Run, text as it holds, and why it is set aside, of every replicate."""
    from sameline.records.runs import read_measurements

    with lab.reading(as_of) as reading:
        return [(m.run, m.text, m.excluded) for m in read_measurements(reading)]


# -- corrections lie over what was recorded -------------------------------------------------------------------------


def test_amendments_exclusions_and_restorations_lie_over_what_was_recorded(lab: Lab):
    lab.record([run("B1", 1, "70.10", "70.2"), run("B2", 1, "71.0")])
    lab.amend(lab.find_measurements(1, 1)[0], replicate(1, "70.40"), reason="a slip")
    lab.amend(lab.find_measurements(1, 1)[0], replicate(1, "<70"), reason="another")
    held = lab.find_measurements(1, 1)[0]
    assert (held.text, held.value, held.qualifier, held.amended) == ("<70", 70.0, "<", True)
    lab.exclude("specimen damaged", measurement=2, reason="cut")
    lab.exclude("wrong specimen", run=1, reason="not B1's")
    assert values(lab) == [(1, "<70", "wrong specimen"), (1, "70.2", "specimen damaged"), (2, "71.0", None)]
    lab.restore(run=1, reason="it was")
    assert values(lab) == [(1, "<70", None), (1, "70.2", "specimen damaged"), (2, "71.0", None)]
    lab.exclude("other stated cause", batch=2, reason="returned")
    assert values(lab)[2] == (2, "71.0", "other stated cause")
    lab.restore(measurement=2, reason="not cut")
    lab.restore(batch=2, reason="kept")
    assert values(lab) == [(1, "<70", None), (1, "70.2", None), (2, "71.0", None)]


def test_a_correction_that_corrects_nothing_is_refused(lab: Lab):
    lab.record([run("B1", 1, "70.1", "70.2")])
    held = lab.find_measurements(1, 1)[0]
    refusals = (
        (lambda: lab.amend(held, replicate(1, "70.1"), reason="x"), "70.1 already"),
        (lambda: lab.restore(run=1, reason="x"), "not set aside"),
        (lambda: lab.exclude("bad luck", run=1, reason="x"), "not an assignable cause"),
        (lambda: lab.restate("batch", "B1", supplier="ALDER", reason="x"), "says so already"),
        (lambda: lab.find_measurements(1, 3), "no replicate 3 in run 1"),
        (lambda: lab.find_measurements(7), "no run 7"),
    )
    before = lab.trail()
    for refused, words in refusals:
        with pytest.raises(CallError, match=words):
            refused()
    lab.exclude("specimen damaged", run=1, reason="cut")
    with pytest.raises(CallError, match="set aside already"):
        lab.exclude("specimen damaged", run=1, reason="cut")
    assert len(lab.trail()) == len(before) + 1


def test_a_trailing_zero_is_an_amendment(lab: Lab):
    """12.50 is not 12.5: its resolution is a fact."""
    lab.record([run("B1", 1, "70.5")])
    lab.amend(lab.find_measurements(1, 1)[0], replicate(1, "70.50"), reason="the second decimal was read")
    assert lab.find_measurements(1, 1)[0].text == "70.50"


def test_one_file_is_taken_in_once(lab: Lab):
    first = lab.record([run("B1", 1, "70.1")], source("day.csv"))
    again = source("day.csv")
    renamed = type(again)("renamed.csv", again.sha256, again.size)
    for file in (again, renamed):
        with pytest.raises(SamelineError, match=r"taken in already, as day\.csv") as caught:
            lab.record([run("B1", 2, "70.2")], file)
        assert f"entry {first.entry}" in caught.value.advice
    assert len(values(lab)) == 1
    assert lab.record([run("B1", 2, "70.2")], source("next.csv")).runs == (2,)


def test_nothing_to_record_is_refused(lab: Lab):
    with pytest.raises(CallError, match="no run"):
        lab.record([])


def test_codes_that_are_not_registered_are_refused_whole(lab: Lab):
    before = lab.trail()
    for draft in (run("B77", 1, "70"), run("B1", 1, "70", characteristic="x"), run("B1", 1, "70", analyst="eve")):
        with pytest.raises(CallError, match="registered"):
            lab.record([run("B1", 1, "70.1"), draft])
    assert lab.trail() == before
    assert values(lab) == []


# -- as of ----------------------------------------------------------------------------------------------------------


def test_what_the_lab_knew_then(lab: Lab):
    lab.compare(statement("all"))
    first = lab.record([run("B1", 1, "70.1", "70.3"), run("B2", 1, "71.1", "71.3")]).entry
    amended = lab.amend(lab.find_measurements(1, 1)[0], replicate(1, "75.0"), reason="a slip").entry
    aside = lab.exclude("wrong specimen", run=1, reason="not B1's").entry
    lab.restate("batch", "B2", supplier="BIRCH", reason="the note")
    assert values(lab, first - 1) == []
    assert values(lab, first)[0] == (1, "70.1", None)
    assert values(lab, amended)[0] == (1, "75.0", None)
    assert values(lab, aside)[0] == (1, "75.0", "wrong specimen")
    assert [row["supplier"] for row in lab.listing("batch", aside)] == ["ALDER", "ALDER", "BIRCH", "BIRCH"]
    assert [row["supplier"] for row in lab.listing("batch")] == ["ALDER", "BIRCH", "BIRCH", "BIRCH"]
    versions = [c.version for c in lab.history("all", first + 1)]
    assert versions == [1, 2]
    assert lab.conclusion("all", as_of=first + 1).answer == lab.conclusion("all", version=2).answer
    assert [c.version for c in lab.history("all")] == [1, 2, 3, 4, 5]
    assert lab.overview(first)[0][2]
    assert not lab.overview(first + 1)[0][2]


def test_as_of_a_moment_counts_in_the_laboratory_s_zone(lab: Lab):
    """The clock stands at 10:00 UTC, 11:00 in Vienna, and goes on by a minute an act."""
    lab.record([run("B1", 1, "70.1")])
    at = lab.trail()[-1].at
    assert at == "2026-03-02T10:01:00.000000Z"
    assert len(values(lab, "2026-03-02T11:01")) == 1
    assert values(lab, "2026-03-02T11:00:59") == []
    assert len(values(lab, "2026-03-02T10:01:00Z")) == 1
    assert values(lab, "2026-03-02T10:01") == []
    assert len(values(lab, "2026-03-02")) == 1
    with pytest.raises(CallError, match="nothing had been recorded"):
        values(lab, "2026-03-01")
    with pytest.raises(CallError, match="no entry"):
        values(lab, 10_000)
    with pytest.raises(CallError, match="not a date"):
        values(lab, "yesterday")


def test_a_day_ends_where_the_next_begins_when_clocks_change(lab: Lab):
    """29 March 2026 has 23 hours in Vienna (the European Union's summer time begins)."""
    import datetime as dt

    lab._clock = laboratory.Clock(dt.datetime(2026, 3, 29, 21, 58, tzinfo=dt.UTC))
    lab.record([run("B1", 1, "70.1")])
    lab.record([run("B1", 1, "70.2")])
    assert lab.trail()[-1].at == "2026-03-29T22:00:00.000000Z"
    assert len(values(lab, "2026-03-29")) == 1
    assert len(values(lab, "2026-03-30")) == 2


def test_the_trail_is_filtered(lab: Lab):
    lab.compare(statement("all"))
    lab.record([run("B1", 1, "70.1")])
    lab.record([run("B2", 1, "70.1")])
    lab.amend(lab.find_measurements(1, 1)[0], replicate(1, "75.0"), reason="a slip")
    lab.exclude("wrong specimen", batch=2, reason="x")
    acts_of = lambda **only: [entry.act for entry in lab.trail(**only)]  # noqa: E731 - one line says it
    assert acts_of(batch="B1") == ["add batch", "log", "amend"]
    assert acts_of(batch="B2") == ["add batch", "log", "exclude"]
    assert acts_of(comparison="all") == ["compare", "conclude"] + ["log", "conclude"] * 2 + [
        "amend",
        "conclude",
        "exclude",
        "conclude",
    ]
    assert acts_of(person="ben") == []
    assert acts_of(last=1) == ["conclude"]
    assert acts_of(until="2026-03-02T11:00")[-1] == "add characteristic"
    assert acts_of(since="2026-03-02T11:00")[0] == "compare"


# -- behind, and caught up ------------------------------------------------------------------------------------------


class KilledError(BaseException):
    """Stands for the end of the process."""


def test_cut_short_between_act_and_conclusion(lab: Lab, monkeypatch: pytest.MonkeyPatch):
    lab.compare(statement("all"))
    lab.compare(statement("own", margin=1.0))

    def dies(*_: object, **__: object) -> None:
        raise KilledError

    with monkeypatch.context() as patch:
        patch.setattr(acts, "bring_up_to_date", dies)
        with pytest.raises(KilledError):
            lab.record([run("B1", 1, "70.1"), run("B2", 1, "70.4")])
        recorded = lab.trail()[-1]
        assert recorded.act == "log"
    assert [(name, late) for name, _, late in lab.overview()] == [("all", True), ("own", True)]
    found = lab.verify()
    assert (found.findings, found.behind) == ((), ("all", "own"))
    outcome = lab.record([run("B3", 1, "70.4")])
    assert [c.name for c in outcome.conclusions] == ["all", "own"]
    assert outcome.conclusions[0].causes == (recorded.number, outcome.entry)
    assert not any(late for *_, late in lab.overview())
    assert lab.verify().findings == ()


def test_catching_up(lab: Lab, monkeypatch: pytest.MonkeyPatch):
    lab.compare(statement("all"))

    def fails(*_: object, **__: object) -> None:
        raise ArithmeticError("the engine gave up")

    with monkeypatch.context() as patch:
        patch.setattr(acts, "bring_up_to_date", fails)
        outcome = lab.record([run("B1", 1, "70.1"), run("B2", 1, "70.4")])
        assert outcome.behind == (("all", "the engine gave up"),)
    (done,) = lab.catch_up().conclusions
    assert (done.version, done.causes) == (2, (outcome.entry,))
    assert lab.catch_up().conclusions == ()


def test_two_who_catch_up_at_once_conclude_once(lab: Lab):
    """The slower of the two finds the work done, and records nothing."""
    from sameline.conclusions.conclude import bring_up_to_date

    lab.compare(statement("all"))
    before = lab.trail()
    again = bring_up_to_date(lab._store, 1, by="ben", at=laboratory.moment(40))
    assert again.version == 1
    assert lab.trail() == before


def test_a_batch_of_more_than_a_query_can_name(lab: Lab):
    """Many runs of many batches at once are recorded, read, and awaken what they touch."""
    with lab._act("add batch", None) as act:
        for number in range(600):
            registry.register(act, registry.KINDS["batch"], f"N{number}", material="RC80", supplier="ALDER")
    lab.compare(statement("eighties", of_material="RC80", groups=("N1", "N2")))
    outcome = lab.record([run(f"N{number}", 1, "70.1", "70.2") for number in range(600)])
    assert [c.name for c in outcome.conclusions] == ["eighties"]
    assert len(lab.measurements()) == 1200


def test_the_same_store_by_two_people(lab: Lab, tmp_path: object):
    lab.record([run("B1", 1, "70.1")])
    with open_lab(f"{tmp_path}/bare.db", by="ben") as other:
        other.amend(other.find_measurements(1, 1)[0], replicate(1, "70.3"), reason="checked")
    assert [entry.person for entry in lab.trail()[-2:]] == ["ana", "ben"]
    assert lab.find_measurements(1, 1)[0].text == "70.3"
