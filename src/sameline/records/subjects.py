"""What an entry of the ledger is about, in words: "batch B-117", "run 12, replicate 3 of B-117", "seal set v4"."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from typing import Any

from sqlalchemy import Row, Select, and_, select

from sameline.records import tables as t
from sameline.records.registry import KINDS
from sameline.records.store import Reading

Manifest = Mapping[str, tuple[int, int]]
"""Table -> first id and count of the rows that an entry wrote."""

MOST = 4
"""So many things are named of one entry; then how many more."""


def subjects(reading: Reading, entries: Mapping[int, Manifest]) -> dict[int, list[str]]:
    """What each entry is about.

    Args:
        reading: the view.
        entries: number -> what the entry wrote.
    """
    found: dict[int, dict[str, None]] = {number: {} for number in entries}
    for table, (query, words) in _QUESTIONS.items():
        spans = [manifest[table] for manifest in entries.values() if table in manifest]
        if not spans:
            continue
        low, high = min(first for first, _ in spans), max(first + count for first, count in spans)
        key = t.metadata.tables[table].c.id
        for row in reading.connection.execute(query().where(key >= low, key < high).order_by(key)):
            if row.entry in found:
                found[row.entry][words(row)] = None
    return {number: _few(list(said)) for number, said in found.items()}


def _few(said: list[str]) -> list[str]:
    return said if len(said) <= MOST + 1 else [*said[:MOST], f"{len(said) - MOST} more"]


def _registered(kind: str) -> tuple[Callable[[], Select[Any]], Callable[[Row[Any]], str]]:
    identity, particulars = KINDS[kind].identity, KINDS[kind].particulars

    def query() -> Select[Any]:
        return select(particulars.c.entry, identity.c.code).join_from(
            particulars, identity, particulars.c[kind] == identity.c.id
        )

    return query, lambda row: f"{kind} {row.code}"


def _runs() -> Select[Any]:
    return select(t.run.c.entry, t.batch.c.code, t.characteristic.c.code.label("what")).select_from(
        t.run.join(t.batch, t.run.c.batch == t.batch.c.id).join(
            t.characteristic, t.run.c.characteristic == t.characteristic.c.id
        )
    )


def _amended_values() -> Select[Any]:
    amendment = t.measurement_amendment
    return select(
        amendment.c.entry, t.measurement.c.run, t.measurement.c.replicate, t.measurement.c.text, t.batch.c.code,
        amendment.c.text.label("now"),
    ).select_from(
        amendment.join(t.measurement, amendment.c.measurement == t.measurement.c.id)
        .join(t.run, t.measurement.c.run == t.run.c.id)
        .join(t.batch, t.run.c.batch == t.batch.c.id)
    )  # fmt: skip


def _set_aside() -> Select[Any]:
    return select(t.exclusion.c.entry, *_placed()).select_from(_places(t.exclusion))


def _put_back() -> Select[Any]:
    restored = t.restoration.join(t.exclusion, t.restoration.c.exclusion == t.exclusion.c.id)
    return select(t.restoration.c.entry, *_placed()).select_from(_places(restored))


def _placed() -> tuple[Any, ...]:
    return t.exclusion.c.run, t.measurement.c.run.label("of_run"), t.measurement.c.replicate, t.batch.c.code


def _places(start: Any) -> Any:  # noqa: ANN401 - a join
    return start.outerjoin(t.measurement, t.exclusion.c.measurement == t.measurement.c.id).outerjoin(
        t.batch, t.exclusion.c.batch == t.batch.c.id
    )


def _place_words(row: Row[Any]) -> str:
    if row.code is not None:
        return f"batch {row.code}"
    return f"run {row.run}" if row.run is not None else f"run {row.of_run}, replicate {row.replicate}"


def _restated_runs() -> Select[Any]:
    return select(t.run_amendment.c.entry, t.run_amendment.c.run)


def _stated() -> Select[Any]:
    revision = t.comparison_revision
    return select(revision.c.entry, t.comparison.c.name, revision.c.revision).join_from(
        revision, t.comparison, revision.c.comparison == t.comparison.c.id
    )


def _concluded() -> Select[Any]:
    return select(t.conclusion.c.entry, t.comparison.c.name, t.conclusion.c.version).join_from(
        t.conclusion, t.comparison, t.conclusion.c.comparison == t.comparison.c.id
    )


def _signed() -> Select[Any]:
    signature = t.conclusion_signature
    return select(signature.c.entry, t.comparison.c.name, t.conclusion.c.version, signature.c.meaning).select_from(
        signature.join(t.conclusion, signature.c.conclusion == t.conclusion.c.id).join(
            t.comparison, t.conclusion.c.comparison == t.comparison.c.id
        )
    )


def _keys() -> Select[Any]:
    key = t.person_key
    return select(key.c.entry, t.person.c.code).where(and_(key.c.person == t.person.c.id))


def _files() -> Select[Any]:
    return select(t.source_file.c.entry, t.source_file.c.name)


def _maps() -> Select[Any]:
    return select(t.heading_map.c.entry, t.heading_map.c.name)


_QUESTIONS: dict[str, tuple[Callable[[], Select[Any]], Callable[[Row[Any]], str]]] = {
    **{f"{kind}_particulars": _registered(kind) for kind in KINDS},
    "source_file": (_files, lambda row: f"file {row.name}"),
    "heading_map": (_maps, lambda row: f"map {row.name}"),
    "run": (_runs, lambda row: f"{row.what} of {row.code}"),
    "measurement_amendment": (
        _amended_values,
        lambda row: f"run {row.run}, replicate {row.replicate} of {row.code}: {row.text} recorded, {row.now} now",
    ),
    "run_amendment": (_restated_runs, lambda row: f"run {row.run}"),
    "exclusion": (_set_aside, _place_words),
    "restoration": (_put_back, _place_words),
    "comparison_revision": (_stated, lambda row: f"{row.name}, revision {row.revision}"),
    "conclusion": (_concluded, lambda row: f"{row.name} v{row.version}"),
    "conclusion_signature": (_signed, lambda row: f"{row.name} v{row.version} as {row.meaning}"),
    "person_key": (_keys, lambda row: f"key of {row.code}"),
}
