"""The canonical form of one record row: a named table and named, typed fields.

A row is `{"fields": {...}, "table": "..."}` in RFC 8785. A field that is None is left out, so that a column added
by a later migration does not change the bytes of the rows that were there before. Bytes are written as lowercase
hexadecimal text. A column has one type, which its table's schema states; the form does not repeat it.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from json.encoder import encode_basestring

from sameline.ledger.canonical import canonical, float_text, integer_text, surrogate_refusal, utf16_order
from sameline.ledger.errors import LedgerError

Field = str | int | float | bool | bytes | None


def row_bytes(table: str, fields: Mapping[str, Field]) -> bytes:
    """The canonical bytes of one row: the plain definition.

    Args:
        table: the table's name.
        fields: each column's name and value.

    Returns:
        The RFC 8785 bytes of `{"fields": fields without None, "table": table}`.

    Raises:
        LedgerError: a value of another type, or one without a canonical form.
    """
    kept = {name: _as_json(value) for name, value in fields.items() if value is not None}
    return canonical({"fields": kept, "table": table})


class RowEncoder:
    """`row_bytes` for many rows of one table.

    The columns are sorted and their names escaped once. `RowEncoder(table, columns)(values)` equals
    `row_bytes(table, dict(zip(columns, values)))` always, refusals included.

    Args:
        table: the table's name.
        columns: its columns' names, in the order of the values given later.

    Raises:
        LedgerError: a column named twice, or a name that is not Unicode.
    """

    def __init__(self, table: str, columns: Sequence[str]) -> None:
        if len(set(columns)) != len(columns):
            raise LedgerError(f"table {table!r} names a column twice")
        try:
            order = sorted(range(len(columns)), key=lambda i: utf16_order(columns[i]))
            self._tail = f'}},"table":{encode_basestring(table)}}}'
            self._tail.encode()
        except UnicodeEncodeError as error:
            raise surrogate_refusal(error) from None
        self._width = len(columns)
        self._plan = [(i, encode_basestring(columns[i]) + ":") for i in order]

    def __call__(self, values: Sequence[Field]) -> bytes:
        """The canonical bytes of one row.

        Args:
            values: one value a column, in the columns' order.

        Raises:
            LedgerError: too few or too many values, a value of another type, or one without a canonical form.
        """
        if len(values) != self._width:
            raise LedgerError(f"{len(values)} values for {self._width} columns")
        texts = [name + _text(value) for i, name in self._plan if (value := values[i]) is not None]
        try:
            return ('{"fields":{' + ",".join(texts) + self._tail).encode()
        except UnicodeEncodeError as error:
            raise surrogate_refusal(error) from None


def _as_json(value: Field) -> Field:
    if isinstance(value, bytes):
        return value.hex()
    if isinstance(value, str | int | float):
        return value
    raise LedgerError(f"a {type(value).__name__} is not a field of a row")


def _text(value: Field) -> str:
    if isinstance(value, str):
        return encode_basestring(value)
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, int):
        return integer_text(value)
    if isinstance(value, float):
        return float_text(value)
    if isinstance(value, bytes):
        return f'"{value.hex()}"'
    raise LedgerError(f"a {type(value).__name__} is not a field of a row")
