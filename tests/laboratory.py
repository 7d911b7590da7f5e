"""A small laboratory made through its own acts, for every test that needs records: invented names and figures."""

from __future__ import annotations

import datetime as dt
import hashlib
from dataclasses import replace
from typing import Any

from cryptography.hazmat.primitives.asymmetric.ed25519 import Ed25519PrivateKey

from sameline.intake.headings import HeadingMap, MapColumn
from sameline.lab import Lab, make_lab, open_lab
from sameline.ledger.signatures import SigningKey, key_id
from sameline.records.comparisons import Statement
from sameline.records.drafts import DraftMeasurement, DraftRun, SourceFile
from sameline.records.moments import utc_text

NAME = "Northbank Testing"
ZONE = "Europe/Vienna"
HEADING_MAP = HeadingMap(
    "drum list",
    (
        MapColumn("Drum", "batch"),
        MapColumn("Day", "tested_at"),
        MapColumn("Reading", "value", characteristic="hardness"),
    ),
)
START = dt.datetime(2026, 3, 2, 8, tzinfo=dt.UTC)


class Clock:
    """A clock that goes on by one minute each time it is read."""

    def __init__(self, start: dt.datetime = START) -> None:
        self.now = start

    def __call__(self) -> str:
        self.now += dt.timedelta(minutes=1)
        return utc_text(self.now)


def moment(day: int, hour: int = 9) -> str:
    """A moment in February 2026, when the runs were tested; days count on beyond it."""
    return utc_text(dt.datetime(2026, 2, 1, hour, tzinfo=dt.UTC) + dt.timedelta(days=day - 1))


def replicates(*texts: str) -> tuple[DraftMeasurement, ...]:
    """Replicates by the figures as written; "<0.5" is censored."""
    return tuple(replicate(number, text) for number, text in enumerate(texts, 1))


def replicate(number: int, text: str) -> DraftMeasurement:
    """One replicate by the figure as written."""
    qualifier = text[0] if text[0] in "<>" else None
    return DraftMeasurement(number, text, float(text.lstrip("<>")), qualifier)


def run(batch: str, day: int, *texts: str, characteristic: str = "hardness", **other: Any) -> DraftRun:  # noqa: ANN401
    """One run, tested on a day."""
    return DraftRun(batch, characteristic, moment(day), replicates(*texts), **{"analyst": "ana", **other})


def source(name: str) -> SourceFile:
    """A file of this name, whose content is its name."""
    return SourceFile(name, hashlib.sha256(name.encode()).hexdigest(), len(name))


def signing_key(number: int) -> SigningKey:
    """A private key, always the same one of this number."""
    return SigningKey(Ed25519PrivateKey.from_private_bytes(bytes([number]) * 32))


def statement(name: str, **other: Any) -> Statement:  # noqa: ANN401 - any of a statement's parts
    """A comparison of hardness between batches on the replicates, unless told otherwise: the quickest to compute."""
    plain = Statement(name, "hardness", "batch", model="pooled", procedure="tukey-kramer", unit="replicate")
    return replace(plain, **other)


def bare(store: str, clock: Clock | None = None) -> Lab:
    """A laboratory in which things are registered, and nothing is tested or asked."""
    lab = make_lab(store, by="ana", person_name="Ana Lindqvist", name=NAME, zone=ZONE, clock=clock or Clock())
    lab.add("person", "ben", name="Ben Okoro", role="quality engineer")
    lab.add("supplier", "ALDER", name="Alder Polymers")
    lab.add("supplier", "BIRCH", name="Birch Compounds", note="since 2019")
    lab.add("material", "RC70", name="Rubber compound 70")
    lab.add("material", "RC80", name="Rubber compound 80")
    lab.add("instrument", "DUR-1", name="Durometer", note="calibrated yearly")
    for code, supplier in (("B1", "ALDER"), ("B2", "ALDER"), ("B3", "BIRCH"), ("B4", "BIRCH")):
        lab.add("batch", code, material="RC70", supplier=supplier, supplier_lot=f"lot {code}")
    limits = {"lower": 65.0, "upper": 75.0, "target": 70.0, "margin": 2.0, "decimals": 1}
    lab.add(
        "characteristic", "hardness", unit="degree", name="Hardness", method="in-house 4", safety_critical=0, **limits
    )
    lab.add("characteristic", "set", unit="%", name="Compression set", safety_critical=1, upper=25.0)
    return lab


def small(store: str, clock: Clock | None = None) -> Lab:
    """A laboratory in which every kind of act has been done, and nothing is behind."""
    lab = bare(store, clock)
    lab.compare(statement("batches"))
    lab.compare(statement("suppliers", grouping="supplier", model="nested", unit="run"))
    lab.compare(statement("two", groups=("B1", "B3"), control="B1", procedure="dunnett", tested_from=moment(2)))
    lab.record([run("B1", 1, "70.1", "70.4", "70.2", instrument="DUR-1", session="morning")])
    lab.record([run("B2", 1, "70.0", "70.3", "70.1", note="first of the drum")])
    lab.record([run("B3", 2, "72.9", "73.3", "73.1"), run("B4", 2, "72.4", "72.0", "72.2")], source("first.csv"))
    lab.record([run(b, 3, f"{70 + i}.25", f"{70 + i}.50", row=2 + i) for i, b in enumerate(("B1", "B2", "B3", "B4"))])
    lab.record([run("B1", 4, "<5", "6.0", characteristic="set")])
    with open_lab(store, by="ben", clock=lab._clock) as ben:
        ben.amend(ben.find_measurements(1, 2)[0], replicate(2, "70.3"), reason="read from the wrong line")
        ben.exclude("instrument fault", run=2, reason="the foot was worn")
        ben.exclude("specimen damaged", measurement=4, reason="cut")
        ben.restore(run=2, reason="the foot was within its limits")
        ben.restate("characteristic", "hardness", margin=1.5, reason="the new drawing")
        ben.restate("batch", "B4", supplier="ALDER", reason="the delivery note says so")
        ben.compare(statement("batches", alpha=0.01), reason="a stricter question")
        ben.amend_run(3, note="the second drum", reason="left out")
    key, old = signing_key(1), signing_key(2)
    lab.register_key("ana", old.public)
    lab.register_key("ana", key.public)
    lab.checkpoint(old)
    lab.sign("batches", "prepared", key)
    lab.revoke_key(key_id(old.public), reason="the laptop is lost")
    lab.checkpoint(key)
    lab.keep_map(HEADING_MAP)
    return lab
