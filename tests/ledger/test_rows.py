import enum
from collections.abc import Callable
from functools import partial

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from sameline.ledger.canonical import MAX_INTEGER, canonical, parse_canonical
from sameline.ledger.errors import LedgerError
from sameline.ledger.rows import BATCH, Field, RowEncoder, row_bytes

texts = st.text(st.characters(exclude_categories=("Cs",)), max_size=12)
fields = (
    st.none()
    | st.booleans()
    | st.integers(-MAX_INTEGER, MAX_INTEGER)
    | st.floats(allow_nan=False, allow_infinity=False)
    | texts
    | st.binary(max_size=8)
)
# Values without a canonical form, and values that are no field at all.
any_fields = (
    fields
    | st.sampled_from([float("nan"), float("inf"), 2**53, -(2**53), 10**30, "\ud800", "a\udfff"])
    | st.sampled_from([[], {}, (1,), 1j, bytearray(b"a")])
)


def outcome(call: Callable[[], object]) -> object:
    try:
        return call()
    except LedgerError as error:
        return error.message


def test_a_row_is_its_table_and_its_named_fields():
    row = row_bytes("replicate", {"value": 12.5, "text": "12.50", "id": 7, "run_id": 3, "digest": b"\x00\xfe"})
    assert row == b'{"fields":{"digest":"00fe","id":7,"run_id":3,"text":"12.50","value":12.5},"table":"replicate"}'


def test_a_column_added_later_does_not_change_an_older_row():
    old = {"id": 1, "name": "Ostrava"}
    assert row_bytes("supplier", {**old, "note": None}) == row_bytes("supplier", old)
    assert RowEncoder("supplier", ["id", "name", "note"])((1, "Ostrava", None)) == row_bytes("supplier", old)


def test_neighbouring_texts_do_not_run_together_and_missing_is_not_the_word_for_it():
    rows = [{"a": "ab", "b": "c"}, {"a": "a", "b": "bc"}, {"a": None, "b": "abc"}, {"a": "None", "b": "abc"}]
    rows += [{"a": "null", "b": "abc"}, {"a": "1"}, {"a": 1}, {"a": 1.5}, {"a": True}, {"a": "true"}, {}]
    assert len({row_bytes("t", row) for row in rows}) == len(rows)
    assert row_bytes("t", {"a": 1}) != row_bytes("u", {"a": 1})


@given(texts, st.dictionaries(texts, fields, max_size=8))
def test_a_row_is_rfc_8785_of_its_fields(table: str, row: dict[str, Field]):
    kept = {k: v.hex() if isinstance(v, bytes) else v for k, v in row.items() if v is not None}
    assert row_bytes(table, row) == canonical({"table": table, "fields": kept})
    assert parse_canonical(row_bytes(table, row)) == {"table": table, "fields": kept}


@given(st.data(), texts, st.lists(texts, max_size=9, unique=True))
def test_the_encoder_equals_the_definition(data: st.DataObject, table: str, columns: list[str]):
    encode = RowEncoder(table, columns)
    rows = data.draw(st.lists(st.tuples(*[fields] * len(columns)), max_size=8))
    want = [row_bytes(table, dict(zip(columns, row, strict=True))) for row in rows]
    assert [encode(row) for row in rows] == want
    assert encode.many(rows) == want


@given(st.data(), st.lists(st.sampled_from([st.integers(), st.floats(), texts, st.booleans()]), min_size=1, max_size=6))
def test_columns_of_one_type_equal_the_definition(data: st.DataObject, kinds: list[st.SearchStrategy[Field]]):
    columns = [f"column {i}" for i in range(len(kinds))]
    encode = RowEncoder("t", columns)
    rows = data.draw(st.lists(st.tuples(*kinds), max_size=20))
    want = [outcome(partial(row_bytes, "t", dict(zip(columns, row, strict=True)))) for row in rows]
    together = outcome(partial(encode.many, rows))
    if any(isinstance(row, str) for row in want):
        assert isinstance(together, str)
    else:
        assert together == want


@given(st.data(), st.lists(texts, min_size=1, max_size=5, unique=True))
def test_the_encoder_refuses_what_the_definition_refuses(data: st.DataObject, columns: list[str]):
    encode = RowEncoder("t", columns)
    values = data.draw(st.tuples(*[any_fields] * len(columns)))
    slow = outcome(lambda: row_bytes("t", dict(zip(columns, values, strict=True))))
    for fast in (outcome(lambda: encode(values)), outcome(lambda: encode.many([values])[0])):
        # Where two values of one row are refused, either may be named.
        assert type(fast) is type(slow)
        assert not isinstance(slow, bytes) or fast == slow


def test_many_rows_of_changing_types_keep_their_order_across_batches():
    encode = RowEncoder("t", ["b", "a", "c"])
    draws = np.random.default_rng(5)
    choices = [None, 0, -3, 2**53 - 1, 0.5, -0.0, 5.0, 1e-7, 1e22, "x", 'a "b"\n', "é", True, False, b"\x01"]
    alike = [(i, f"row {i}", i / 7) for i in range(BATCH + 3)]
    changing = [tuple(choices[k] for k in draws.integers(len(choices), size=3)) for _ in range(3 * BATCH + 1)]
    for rows in (alike, changing, alike + changing + alike, changing[:BATCH], []):
        assert encode.many(iter(rows)) == [encode(row) for row in rows]
        assert encode.many(rows) == [row_bytes("t", dict(zip("bac", row, strict=True))) for row in rows]


def test_subclasses_of_the_types_of_a_field_are_written_by_their_value():
    class Kind(enum.StrEnum):
        RUN = "run"

    rows = [(Kind.RUN, np.float64(5.0)), ("batch", 0.1)]
    want = [row_bytes("t", {"a": "run", "b": 5.0}), row_bytes("t", {"a": "batch", "b": 0.1})]
    encode = RowEncoder("t", ["a", "b"])
    assert [encode(row) for row in rows] == encode.many(rows) == want
    assert encode.many(rows[:1]) == want[:1]


@pytest.mark.parametrize("values", [(), (1,), (1, 2, 3)])
def test_the_encoder_wants_one_value_a_column(values: tuple[int, ...]):
    with pytest.raises(LedgerError, match="2 columns"):
        RowEncoder("t", ["a", "b"])(values)
    with pytest.raises(LedgerError, match="2 columns"):
        RowEncoder("t", ["a", "b"]).many([(1, 2), values])


def test_an_encoder_needs_distinct_unicode_names():
    with pytest.raises(LedgerError, match="twice"):
        RowEncoder("t", ["a", "b", "a"])
    with pytest.raises(LedgerError, match="surrogate"):
        RowEncoder("t", ["\ud800"])
    with pytest.raises(LedgerError, match="surrogate"):
        RowEncoder("\ud800", ["a"])
