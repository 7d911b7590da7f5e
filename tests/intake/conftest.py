"""An invented laboratory's register, and a short way to read texts as files."""

from __future__ import annotations

from collections.abc import Callable, Sequence

import pytest

from sameline.intake.files import Intake, read_files
from sameline.intake.headings import HeadingMap
from sameline.intake.rawfiles import SIZE_LIMIT, RawFile
from sameline.records.drafts import CharacteristicFacts, Register


@pytest.fixture
def register() -> Register:
    facts = {
        "TS": CharacteristicFacts("TS", "MPa", lower=10.0, decimals=1, mean=12.5, spread=0.3),
        "HA": CharacteristicFacts("HA", "Shore A", decimals=0),
        "SET": CharacteristicFacts("SET", "%", upper=25.0, decimals=1),
    }
    return Register(
        batches={"B-117": "NR-60", "B-121": "NR-60", "B-130": "EP-70"},
        characteristics=facts,
        people=frozenset({"ana", "ben"}),
        instruments=frozenset({"RIG-1", "DUR-2"}),
        zone="Europe/Vienna",
        now="2026-12-01T00:00:00.000000Z",
    )


@pytest.fixture
def take(register: Register) -> Callable[..., Intake]:
    """Reads texts or bytes as files named results1.csv, results2.csv, …"""
    known = register

    def read(
        *contents: str | bytes,
        register: Register = known,
        maps: Sequence[HeadingMap] = (),
        limit: int = SIZE_LIMIT,
    ) -> Intake:
        datas = [content if isinstance(content, bytes) else content.encode() for content in contents]
        raws = [RawFile(f"results{number}.csv", data) for number, data in enumerate(datas, 1)]
        return read_files(raws, register, maps=maps, limit=limit)

    return read
