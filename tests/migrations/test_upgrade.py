"""A store of any earlier revision, with data in it, is upgraded when told to, and its ledger is what it was."""

from __future__ import annotations

from collections.abc import Callable

import pytest

import laboratory
from sameline.errors import StoreError
from sameline.lab import make_lab, open_lab
from sameline.records import schema
from sameline.records.acts import read_frontier
from sameline.records.store import Store


def _root(store: str) -> tuple[int, bytes]:
    with Store.open(store) as opened, opened.reading() as reading:
        return reading.position, read_frontier(reading.connection, reading.position).root()


@pytest.mark.parametrize("revision", schema.REVISIONS[:-1])
def test_an_earlier_store_is_upgraded_and_verifies(
    new_place: Callable[[], str], revision: str, monkeypatch: pytest.MonkeyPatch
):
    place = new_place()
    known = schema.REVISIONS
    with monkeypatch.context() as then:
        then.setattr(schema, "REVISIONS", known[: known.index(revision) + 1])
        with laboratory.bare(place) as lab:
            lab.compare(laboratory.statement("all"))
            lab.record([laboratory.run("B1", 1, "70.1", "70.2"), laboratory.run("B2", 1, "71.1", "71.2")])
            lab.exclude("specimen damaged", measurement=1, reason="cut")
        before = _root(place)
    with pytest.raises(StoreError, match="older Sameline"):
        open_lab(place)
    with make_lab(place, by="ana", name="not used", upgrade=True) as lab:
        assert [str(f) for f in lab.verify().findings] == []
    assert _root(place) == before
    with open_lab(place, by="ana") as lab:
        lab.record([laboratory.run("B1", 2, "70.3")])
        assert lab.verify().findings == ()
    with monkeypatch.context() as then:
        then.setattr(schema, "REVISIONS", known[: known.index(revision) + 1])
        with pytest.raises(StoreError, match="newer Sameline"):
            open_lab(place)
