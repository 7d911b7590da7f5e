import pytest
from hypothesis import given
from hypothesis import strategies as st

from sameline.ledger.canonical import canonical
from sameline.ledger.errors import FormatError, LedgerError
from sameline.ledger.manifest import TableRows, manifest_text, parse_manifest

ROOT = bytes(range(32))
GOOD = {"table": "run", "first": 4, "count": 2, "root": ROOT.hex()}


def test_an_entry_lists_its_rows_in_canonical_json():
    text = manifest_text([TableRows("run", 4, 2, ROOT), TableRows("replicate", 11, 10, ROOT[::-1])])
    assert text == (
        f'[{{"count":2,"first":4,"root":"{ROOT.hex()}","table":"run"}},'
        f'{{"count":10,"first":11,"root":"{ROOT[::-1].hex()}","table":"replicate"}}]'
    )


@given(
    st.lists(
        st.builds(
            TableRows,
            st.text(st.characters(exclude_categories=("Cs",)), min_size=1),
            st.integers(0, 2**52),
            st.integers(1, 2**50),
            st.binary(min_size=32, max_size=32),
        ),
        unique_by=lambda part: part.table,
    )
)
def test_a_list_comes_back_the_same(parts: list[TableRows]):
    assert parse_manifest(manifest_text(parts)) == parts


WRONG = [
    [1],
    ["run"],
    [{**GOOD, "count": 0}],
    [{**GOOD, "count": True}],
    [{**GOOD, "count": 1.5}],
    [{**GOOD, "count": 2**53 - 1}],
    [{**GOOD, "first": -1}],
    [{**GOOD, "first": "4"}],
    [{**GOOD, "table": ""}],
    [{**GOOD, "table": None}],
    [{**GOOD, "root": ROOT.hex().upper()}],
    [{**GOOD, "root": ROOT.hex()[:-1]}],
    [{**GOOD, "note": "x"}],
    [{name: GOOD[name] for name in ("table", "first", "count")}],
    [GOOD, GOOD],
]


@pytest.mark.parametrize("items", WRONG, ids=range(len(WRONG)))
def test_what_is_no_list_of_rows_is_refused(items: list[object]):
    with pytest.raises(FormatError, match="list of its rows"):
        parse_manifest(canonical(items).decode())


@pytest.mark.parametrize("text", ["", "[", "{}", "null", "\ud800", "[ ]", '[{"a":1,"a":1}]'])
def test_what_is_not_such_a_text_is_refused(text: str):
    with pytest.raises(FormatError):
        parse_manifest(text)


def test_an_act_that_wrote_no_rows_has_an_empty_list():
    assert manifest_text([]) == "[]"
    assert parse_manifest("[]") == []


def test_what_cannot_be_meant_is_not_written():
    for part in (TableRows("run", 1, 0, ROOT), TableRows("run", -1, 1, ROOT), TableRows("run", 1, 1, b"short")):
        with pytest.raises(LedgerError):
            manifest_text([part])
    with pytest.raises(LedgerError, match="twice"):
        manifest_text([TableRows("run", 1, 1, ROOT), TableRows("run", 2, 1, ROOT)])
