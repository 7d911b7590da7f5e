from __future__ import annotations

import dataclasses
import io
from collections.abc import Callable

import openpyxl
import pytest

from sameline.errors import CallError
from sameline.intake.files import Intake
from sameline.intake.headings import HeadingMap, MapColumn
from sameline.intake.proposals import Proposal, propose_map, renamed
from sameline.intake.rawfiles import RawFile
from sameline.records.drafts import CharacteristicFacts, DraftMeasurement, Register

Take = Callable[..., Intake]

WIDE = (
    "Tensile rig 4;;;;;\n"
    "printed by;RIG-1;;;;\n"
    ";;;;;\n"
    "Lot No.;Date;Operator;TS 1 [N/mm²];TS 2 [N/mm²];Remark\n"
    "B-117;25.03.2026;ana;12,5;12,6;dry\n"
    "B-121;04.03.2026;ben;12,7;12,5;\n"
    "Mean;;;12,6;12,55;\n"
)
LONG = (
    "Lot,Property,Tested,Time,Operator,Specimen,Result (psi)\n"
    "B-117,TS,03/25/2026,8:30 AM,ana,1,1813\n"
    ",,,,,2,1800\n"
    "B-121,TS,03/04/2026,9:30 AM,ben,1,1813\n"
)


def propose(text: str | bytes, register: Register) -> Proposal:
    return propose_map(RawFile("rig.csv", text if isinstance(text, bytes) else text.encode()), register, name="rig")


def test_a_file_with_other_headings_is_refused_until_a_map_is_confirmed(take: Take, register: Register):
    before = take(WIDE)
    assert before.runs == ()
    assert {finding.problem for finding in before.refusals} >= {"the heading 'batch' is missing"}
    after = take(WIDE, maps=[renamed(propose(WIDE, register), "rig")])
    assert after.findings == ()
    assert [(run.batch, run.analyst, run.note, run.row) for run in after.runs] == [
        ("B-117", "ana", "dry", 5),
        ("B-121", "ben", None, 6),
    ]
    assert after.runs[0].measurements == (
        DraftMeasurement(1, "12,5", 12.5, None, "N/mm²"),
        DraftMeasurement(2, "12,6", 12.6, None, "N/mm²"),
    )
    assert (after.parts[0].map, after.parts[0].heading_row) == ("rig", 4)


def test_a_proposal_says_what_it_takes_each_column_for_and_why(register: Register):
    proposal = propose(WIDE, register)
    assert [(guess.column.heading, guess.column.field) for guess in proposal.guesses] == [
        ("Lot No.", "batch"),
        ("Date", "tested_at"),
        ("Operator", "analyst"),
        ("TS 1 [N/mm²]", "value"),
        ("TS 2 [N/mm²]", "value"),
        ("Remark", "note"),
    ]
    assert proposal.guesses[3].column == MapColumn("TS 1 [N/mm²]", "value", "TS", "N/mm²", 1)
    assert proposal.guesses[1].reason == "100% of its cells are dates"
    assert proposal.guesses[0].samples == ("B-117", "B-121", "Mean")
    assert proposal.notes == (
        "all dates fit only the order dmy",
        "the decimal sign is a comma",
        "rows that begin with 'Mean' sum up and are left out",
    )


def test_a_long_file_with_merged_looks_times_and_units_is_proposed(take: Take, register: Register):
    form = renamed(propose(LONG, register), "rig")
    assert (form.date_order, form.fill_down) == ("mdy", ("batch", "characteristic", "tested_at", "analyst", "time"))
    intake = take(LONG, maps=[form])
    assert intake.findings == ()
    assert [(run.batch, run.tested_at, len(run.measurements)) for run in intake.runs] == [
        ("B-117", "2026-03-25T07:30:00.000000Z", 2),
        ("B-121", "2026-03-04T08:30:00.000000Z", 1),
    ]
    assert intake.runs[0].measurements[0].value == pytest.approx(12.50019, rel=1e-6)  # 1813 × 6.894757e-3, SP 811


def test_what_cannot_be_concluded_is_left_to_the_person(register: Register):
    proposal = propose("Charge;Datum;Härte\nB-117;04.03.2026;60\n".encode("cp1252"), register)
    assert proposal.map.missing() == ("characteristic",)
    assert proposal.map.encoding == "cp1252"
    assert any("say dmy, mdy or ymd" in note for note in proposal.notes)
    with pytest.raises(CallError, match="characteristic"):
        renamed(proposal, "hardness")
    told = dataclasses.replace(proposal.map, constants=(("characteristic", "HA"),), date_order="dmy", name="hardness")
    told.check()


def test_a_map_with_an_encoding_a_constant_and_an_order_reads_the_file(take: Take, register: Register):
    data = "Charge;Datum;Härte\nB-117;04.03.2026;60\n".encode("cp1252")
    proposal = propose(data, register)
    told = dataclasses.replace(proposal.map, constants=(("characteristic", "HA"),), date_order="dmy", name="hardness")
    intake = take(data, maps=[told])
    assert intake.findings == ()
    assert [(run.characteristic, run.tested_at) for run in intake.runs] == [("HA", "2026-03-03T23:00:00.000000Z")]


def test_the_only_characteristic_is_proposed_as_a_constant(register: Register):
    one = dataclasses.replace(register, characteristics={"HA": CharacteristicFacts("HA", "Shore A")})
    proposal = propose("Lot,Date,Reading\nB-117,2026-03-04,60\n", one)
    assert proposal.map.constants == (("characteristic", "HA"),)


def test_a_workbook_is_proposed_too(take: Take, register: Register):
    book = openpyxl.Workbook()
    for row in (["Gauge report"], [], ["Sample", "When", "HA", "TS (psi)"], ["B-117", "2026-03-04", 60, 1813]):
        book.worksheets[0].append(row)
    stream = io.BytesIO()
    book.save(stream)
    form = renamed(propose_map(RawFile("book.xlsx", stream.getvalue()), register), "gauge")
    intake = take(stream.getvalue(), maps=[form])
    assert intake.findings == ()
    assert [(run.characteristic, run.measurements[0].text, run.measurements[0].unit) for run in intake.runs] == [
        ("HA", "60", None),
        ("TS", "1813", "psi"),
    ]


@pytest.mark.parametrize("text", ["", "1,2,3\n4,5,6\n", "only one column\n1\n", "\0\0"])
def test_a_file_without_headings_cannot_be_proposed(register: Register, text: str):
    with pytest.raises(CallError):
        propose(text, register)


def test_a_map_goes_through_its_text_unchanged(register: Register):
    for text in (WIDE, LONG):
        form = renamed(propose(text, register), "rig")
        assert HeadingMap.from_json(form.to_json()) == form


@pytest.mark.parametrize(
    "text",
    [
        "",
        "[]",
        "null",
        '{"name": "x"}',
        '{"name": "x", "columns": [{"heading": "a", "field": "wrong"}]}',
        '{"name": "x", "columns": [{"heading": "a", "field": "batch"}]}',
        '{"name": "x", "columns": [{"a": 1}]}',
    ],
)
def test_a_text_that_is_no_map_is_refused(text: str):
    with pytest.raises(CallError):
        HeadingMap.from_json(text)


COLUMNS = tuple(MapColumn(name, name) for name in ("batch", "characteristic", "tested_at", "value"))


@pytest.mark.parametrize(
    "form",
    [
        HeadingMap("x", (*COLUMNS, MapColumn("b", "batch"))),
        HeadingMap("x", COLUMNS[1:]),
        HeadingMap("x", COLUMNS, zone="Nowhere/Else"),
        HeadingMap("x", (*COLUMNS, MapColumn("v", "value", replicate=0))),
    ],
)
def test_a_map_that_cannot_be_meant_is_refused(form: HeadingMap):
    with pytest.raises(CallError):
        form.check()


def test_two_maps_that_fit_alike_are_not_chosen_between(take: Take):
    columns = (MapColumn("Lot", "batch"), MapColumn("P", "characteristic"), MapColumn("D", "tested_at"))
    maps = [
        HeadingMap(name, (*columns, MapColumn("V", "value", unit=unit))) for name, unit in (("a", None), ("b", "psi"))
    ]
    text = "Lot,P,D,V\nB-117,TS,2026-03-04,12.5\n"
    (finding,) = take(text, maps=maps).findings
    assert finding.problem == "several maps fit these headings: 'a', 'b'"
    assert len(take(text, maps=maps[:1]).runs) == 1


def test_a_map_may_state_the_zone(take: Take):
    columns = tuple(MapColumn(f"my {name}", name) for name in ("batch", "characteristic", "tested_at", "value"))
    text = "my batch,my characteristic,my tested_at,my value\nB-117,TS,2026-03-04T08:30,12.5\n"
    moments = [take(text, maps=[HeadingMap("rig", columns, zone=zone)]).runs[0].tested_at for zone in (None, "UTC")]
    assert moments == ["2026-03-04T07:30:00.000000Z", "2026-03-04T08:30:00.000000Z"]


WIDE_OWN = "batch,characteristic,tested_at,replicate 1,replicate 2,replicate 3\n"


def test_our_own_wide_form_needs_no_map(take: Take):
    intake = take(WIDE_OWN + "B-117,TS,2026-03-04,12.5,12.6,12.7\nB-121,TS,2026-03-04,12.4,12.3,\n")
    assert intake.findings == ()
    assert [[m.text for m in run.measurements] for run in intake.runs] == [["12.5", "12.6", "12.7"], ["12.4", "12.3"]]


def test_gaps_and_absent_values_of_the_wide_form(take: Take):
    intake = take(
        WIDE_OWN + "B-117,TS,2026-03-04,12.5,,12.7\nB-121,TS,2026-03-04,12.4,n/a,12.2\nB-130,TS,2026-03-04,,,\n"
    )
    assert [(f.row, f.column, f.problem, f.question) for f in intake.findings] == [
        (2, "replicate", "replicate 2 of this run is not there", True),
        (3, "replicate 2", "'n/a' states no figure", True),
        (4, None, "the row holds no values", False),
    ]
    assert [[m.replicate for m in run.measurements] for run in intake.runs] == [[1, 3], [1, 3]]
    assert intake.parts[0].held == (4,)


def test_long_and_wide_form_of_the_same_results_are_the_same_runs(take: Take):
    long = "batch,characteristic,tested_at,replicate,value\n" + "".join(
        f"{batch},TS,2026-03-04,{number},{value}\n"
        for batch, values in (("B-117", (12.5, 12.6)), ("B-121", (12.4, 12.2)))
        for number, value in enumerate(values, 1)
    )
    wide = (
        "batch,characteristic,tested_at,value_1,value_2\nB-117,TS,2026-03-04,12.5,12.6\nB-121,TS,2026-03-04,12.4,12.2\n"
    )
    bare = [[dataclasses.replace(run, row=None) for run in take(text).runs] for text in (long, wide)]
    assert bare[0] == bare[1]


def test_a_row_of_units_below_the_headings_is_read_as_such_each_time(take: Take, register: Register):
    text = "Lot;Date;TS 1;TS 2\n;;[psi];[psi]\nB-117;2026-03-04;1813;1800\n"
    proposal = propose(text, register)
    assert proposal.map.unit_row
    form = renamed(proposal, "rig")
    assert [m.unit for m in take(text, maps=[form]).runs[0].measurements] == ["psi", "psi"]
    other = take(text.replace("[psi]", "MPa").replace("1813", "12.5").replace("1800", "12,4"), maps=[form])
    assert [m.unit for m in take(text.replace("[psi]", "kgf/cm²"), maps=[form]).runs[0].measurements] == ["kgf/cm²"] * 2
    assert [finding.problem for finding in other.refusals] == ["'12,4' has another decimal sign than '12.5' in row 3"]
    assert take(text.replace("[psi]", "parsec"), maps=[form]).runs == ()


def test_columns_of_one_name_are_told_apart_by_their_order(take: Take):
    columns = [("Lot", "batch"), ("P", "characteristic"), ("D", "tested_at"), *[("Value", "value")] * 3]
    form = HeadingMap("rig", tuple(MapColumn(*column) for column in columns))
    intake = take("Lot,P,D,Value,Value,Value\nB-117,TS,2026-03-04,12.5,12.6,12.7\n", maps=[form])
    assert intake.findings == ()
    assert [(m.replicate, m.text) for m in intake.runs[0].measurements] == [(1, "12.5"), (2, "12.6"), (3, "12.7")]
    assert take("Lot,P,D,Value,Value\nB-117,TS,2026-03-04,12.5,12.6\n", maps=[form]).runs == ()


def test_a_column_that_the_map_does_not_know_is_asked_about(take: Take):
    columns = [("Lot", "batch"), ("P", "characteristic"), ("D", "tested_at"), ("V", "value"), ("x", "ignore")]
    form = HeadingMap("rig", tuple(MapColumn(*column) for column in columns))
    (finding,) = take("Lot,P,D,x,V,V\nB-117,TS,2026-03-04,,12.5,12.6\n", maps=[form]).findings
    assert (finding.column, finding.question) == ("V", True)
    assert finding.problem == "the column 'V' is not in the map 'rig'"
