"""The demo scenario as a reader of the seed folder sees it: files taken in and amendments made, step by step."""

from __future__ import annotations

import json
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import pandas as pd
import pytest

SEED = Path(__file__).parents[2] / "seed"


@dataclass(frozen=True)
class Recorded:
    """What is recorded after each step, and what each comparison sees of it."""

    steps: list[dict[str, Any]]
    folder: Path

    def registered(self, kind: str) -> pd.DataFrame:
        """Everything of one kind ("batches", "characteristics" …) that is ever registered, by code."""
        items = [item for step in self.steps for item in step.get(kind, ())]
        assert len({item["code"] for item in items}) == len(items)
        return pd.DataFrame(items).set_index("code")

    def after(self, step: int) -> pd.DataFrame:
        """All rows recorded up to and with this step, as amended so far; `value` as a number."""
        files = [pd.read_csv(self.folder / s["file"], dtype=str) for s in self.steps[: step + 1] if s["act"] == "take"]
        rows = pd.concat(files, ignore_index=True)
        for amend in (s for s in self.steps[: step + 1] if s["act"] == "amend"):
            key = ["batch", "characteristic", "tested_at"]
            hit = (rows[key] == [amend[k] for k in key]).all(axis=1) & (rows["replicate"] == str(amend["replicate"]))
            assert hit.sum() == 1
            assert rows.loc[hit, "value"].item() == amend["recorded"]
            rows.loc[hit, "value"] = amend["value"]
        rows["value"] = rows["value"].astype(float)
        batches = self.registered("batches")
        return rows.assign(
            supplier=rows["batch"].map(batches["supplier"]), material=rows["batch"].map(batches["material"])
        )

    def comparison(self, name: str) -> dict[str, Any]:
        (step,) = (s for s in self.steps if s["act"] == "compare" and s["name"] == name)
        return step

    def scope(self, name: str, rows: pd.DataFrame) -> pd.DataFrame:
        """The rows that a comparison is about, with the column `group`."""
        asked = self.comparison(name)
        rows = rows.assign(group=rows[asked["grouping"]])
        keep = rows["characteristic"] == asked["characteristic"]
        for column in ("material", "supplier"):
            if f"of_{column}" in asked:
                keep &= rows[column] == asked[f"of_{column}"]
        if "groups" in asked:
            keep &= rows["group"].isin(asked["groups"])
        return rows[keep]

    def looks(self, name: str) -> dict[str, pd.DataFrame]:
        """The rows of a comparison at each of its looks: day of the act that brought the data -> rows."""
        seen: dict[str, pd.DataFrame] = {}
        for number, step in enumerate(self.steps):
            if step["act"] in {"take", "amend"}:
                rows = self.scope(name, self.after(number))
                last = next(reversed(seen.values()), None)
                if len(rows) and (last is None or not rows.reset_index(drop=True).equals(last.reset_index(drop=True))):
                    seen[step["at"][:10]] = rows
        return seen


@pytest.fixture(scope="session")
def seed_folder() -> Path:
    return SEED


@pytest.fixture(scope="session")
def recorded() -> Recorded:
    steps = json.loads((SEED / "scenario.json").read_text(encoding="utf-8"))["steps"]
    return Recorded(steps, SEED)
