"""Random single changes behind Sameline's back, each from a seed of its own: all are found, and each is named."""

from __future__ import annotations

from collections import Counter

import pytest

import attacker as a
from attacker import found
from sameline.records.checks import Finding


def campaign(store: str, seeds: range) -> Counter[str]:
    """Random single changes, each found and named; how many of each sort."""
    done: Counter[str] = Counter()
    for seed in seeds:
        with a.unguarded(store) as connection:
            change = a.change_something(connection, seed)
            if change is None:
                continue
            findings = found(connection)
            assert findings, (seed, change)
            assert _names(findings, change), (seed, change, [str(f) for f in findings])
            done[change.what] += 1
    return done


def _names(findings: list[Finding], change: a.Change) -> bool:
    """Whether a finding names the row, the stretch that its entry wrote, or (for an entry) the one that follows it."""
    for f in findings:
        if f.table == change.table and f.row is not None:
            if f.row == change.row or f.check == 6 or change.what in {"double", "swap"}:
                return True
            if change.table == "entry" and f.row == change.row + 1:
                return True
        if change.table == "entry" and f.table == "tree_node":
            return True
    return False


def test_random_changes_are_all_found(sqlite_module_store: str):
    done = campaign(sqlite_module_store, range(100))
    assert done.total() >= 75
    assert len(done) == 7


def test_random_changes_are_all_found_on_postgresql(postgresql_store: str):
    assert campaign(postgresql_store, range(1000, 1008)).total() >= 5


@pytest.mark.slow
def test_two_thousand_random_changes_are_all_found(sqlite_module_store: str):
    done = campaign(sqlite_module_store, range(10_000, 12_700))
    print(sorted(done.items()), done.total())
    assert done.total() >= 2000
