"""What intake must know of a store, looked up only where it is asked: a run costs the same in a store of any age."""

from __future__ import annotations

import math
from collections.abc import Callable, Container, Iterator, Mapping
from typing import Any, Generic, TypeVar, cast

from sqlalchemy import Connection, select

from sameline.records import tables as t
from sameline.records.drafts import CharacteristicFacts, Register
from sameline.records.registry import KINDS, codes, current
from sameline.records.runs import laboratory_zone
from sameline.records.store import Reading

_FEW_VALUES = 8  # below this, a characteristic's spread says too little to question a value
_RECENT_RUNS = 200  # the spread is that of the last runs

T = TypeVar("T")


def read_register(reading: Reading, now: str) -> Register:
    """What is registered and recorded, as intake needs it; good while the reading is open."""
    connection = reading.connection
    return Register(
        batches=_Looked(lambda code: _material(connection, code), lambda: _all(connection, "batch")),
        characteristics=_Looked(lambda code: _facts(connection, code), lambda: _all(connection, "characteristic")),
        people=_Looked(lambda code: _id(connection, "person", code), lambda: _all(connection, "person")),
        instruments=_Looked(lambda code: _id(connection, "instrument", code), lambda: _all(connection, "instrument")),
        zone=laboratory_zone(connection),
        now=now,
        runs=_RecordedRuns(connection),
    )


def read_facts(reading: Reading, characteristic: int) -> CharacteristicFacts:
    """What checking a value needs to know of a characteristic, by its id."""
    identity = t.characteristic
    code = reading.connection.execute(select(identity.c.code).where(identity.c.id == characteristic)).scalar_one()
    return _facts_of(reading.connection, characteristic, code)


class _Looked(Mapping[str, T], Generic[T]):
    """A mapping that asks the store for each code once, and for all codes only when all are wanted."""

    def __init__(self, look: Callable[[str], T | None], everything: Callable[[], list[str]]) -> None:
        self._look = look
        self._everything = everything
        self._known: dict[str, T | None] = {}

    def __getitem__(self, code: str) -> T:
        if code not in self._known:
            self._known[code] = self._look(code)
        found = self._known[code]
        if found is None:
            raise KeyError(code)
        return found

    def __iter__(self) -> Iterator[str]:
        return iter(self._everything())

    def __len__(self) -> int:
        return len(self._everything())


class _RecordedRuns(Container[tuple[str, str, str]]):
    """Batch, characteristic and moment of the runs recorded, read for one batch and characteristic at a time."""

    def __init__(self, connection: Connection) -> None:
        self._connection = connection
        self._known: dict[tuple[str, str], frozenset[str]] = {}

    def __contains__(self, run: object) -> bool:
        batch, characteristic, tested_at = cast("tuple[str, str, str]", run)
        key = (batch, characteristic)
        if key not in self._known:
            self._known[key] = frozenset(self._moments(*key))
        return tested_at in self._known[key]

    def _moments(self, batch: str, characteristic: str) -> list[str]:
        of_batch = select(t.batch.c.id).where(t.batch.c.code == batch).scalar_subquery()
        of_kind = select(t.characteristic.c.id).where(t.characteristic.c.code == characteristic).scalar_subquery()
        query = select(t.run.c.tested_at).where(t.run.c.characteristic == of_kind, t.run.c.batch == of_batch)
        return list(self._connection.execute(query).scalars())


def _all(connection: Connection, kind: str) -> list[str]:
    return list(codes(connection, KINDS[kind]).values())


def _id(connection: Connection, kind: str, code: str) -> int | None:
    identity = KINDS[kind].identity
    found: int | None = connection.execute(select(identity.c.id).where(identity.c.code == code)).scalar()
    return found


def _material(connection: Connection, code: str) -> str | None:
    number = _id(connection, "batch", code)
    if number is None:
        return None
    material: int = current(connection, KINDS["batch"], number)["material"]
    return connection.execute(select(t.material.c.code).where(t.material.c.id == material)).scalar()


def _facts(connection: Connection, code: str) -> CharacteristicFacts | None:
    number = _id(connection, "characteristic", code)
    return None if number is None else _facts_of(connection, number, code)


def _facts_of(connection: Connection, number: int, code: str) -> CharacteristicFacts:
    row: dict[str, Any] = current(connection, KINDS["characteristic"], number)
    unit = connection.execute(select(t.characteristic.c.unit).where(t.characteristic.c.id == number)).scalar_one()
    mean, spread = _recent_spread(connection, number)
    return CharacteristicFacts(
        code=code,
        unit=unit,
        lower=row["lower"],
        upper=row["upper"],
        decimals=row["decimals"],
        safety_critical=bool(row["safety_critical"]),
        mean=mean,
        spread=spread,
    )


def _recent_spread(connection: Connection, characteristic: int) -> tuple[float | None, float | None]:
    """Mean and standard deviation of the uncensored values of the last runs of a characteristic."""
    run, value = t.run, t.measurement
    recent = select(run.c.id).where(run.c.characteristic == characteristic).order_by(run.c.id.desc())
    query = select(value.c.value).where(value.c.run.in_(recent.limit(_RECENT_RUNS)), value.c.qualifier.is_(None))
    values = connection.execute(query).scalars().all()
    if len(values) < _FEW_VALUES:
        return None, None
    mean = math.fsum(values) / len(values)
    return mean, math.sqrt(math.fsum((x - mean) ** 2 for x in values) / (len(values) - 1))
