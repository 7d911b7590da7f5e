"""The canonical form of one record row: a named table and named, typed fields.

A row is `{"fields": {...}, "table": "..."}` in RFC 8785. A field that is None is left out, so that a column added
by a later migration does not change the bytes of the rows that were there before. Bytes are written as lowercase
hexadecimal text. A column has one type, which its table's schema states; the form does not repeat it.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping, Sequence
from itertools import chain, islice
from json.encoder import encode_basestring
from typing import Final

from sameline.ledger.canonical import (
    canonical,
    float_text,
    integer_text,
    parse_canonical,
    surrogate_refusal,
    utf16_order,
)
from sameline.ledger.errors import FormatError, LedgerError

Field = str | int | float | bool | bytes | None
"""What a column of a record row may hold."""

BATCH: Final = 512
"""Rows that `RowEncoder.many` turns from rows into columns at a time: few enough to stay in the processor's cache."""


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


def parse_row(data: bytes) -> tuple[str, dict[str, object]]:
    """Read a row's canonical bytes back.

    Returns:
        The table's name and the fields. Bytes come back as the hexadecimal text they were written as, and a whole
        float as an int.

    Raises:
        FormatError: not the canonical bytes of a row.
    """
    match parse_canonical(data):
        case {"fields": dict(fields), "table": str(table), **rest} if not rest:
            if not any(value is None or isinstance(value, dict | list) for value in fields.values()):
                return table, fields
    raise FormatError("JSON, but not a row: its fields and its table, and nothing else")


class RowEncoder:
    """`row_bytes` for many rows of one table.

    The columns are sorted and their names escaped once. `RowEncoder(table, columns)(values)` equals
    `row_bytes(table, dict(zip(columns, values)))` always, refusals included, and `many` the same for each row.

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
        self._names = [(i, encode_basestring(columns[i]) + ":") for i in order]

    def __call__(self, values: Sequence[Field]) -> bytes:
        """The canonical bytes of one row.

        Args:
            values: one value a column, in the columns' order.

        Raises:
            LedgerError: too few or too many values, a value of another type, or one without a canonical form.
        """
        self._check_width(len(values))
        texts = [name + _text(value) for i, name in self._names if (value := values[i]) is not None]
        return _utf8('{"fields":{' + ",".join(texts) + self._tail)

    def many(self, rows: Iterable[Sequence[Field]]) -> list[bytes]:
        """The canonical bytes of each row, in the rows' order; several times faster than a call a row.

        Args:
            rows: one value a column each, in the columns' order.

        Raises:
            LedgerError: as for one row.
        """
        rows = iter(rows)
        done: list[bytes] = []
        while batch := list(islice(rows, BATCH)):
            for width in set(map(len, batch)):
                self._check_width(width)
            done += self._batch(batch)
        return done

    def _check_width(self, width: int) -> None:
        if width != self._width:
            raise LedgerError(f"{width} values for {self._width} columns")

    def _batch(self, rows: list[Sequence[Field]]) -> list[bytes]:
        """Encode rows column by column where each column holds one type, else in groups of rows of like types."""
        values = list(chain.from_iterable(rows))
        kinds = list(map(type, rows[0]))
        if list(map(type, values)) == kinds * len(rows):
            return self._alike(values, kinds, len(rows))
        groups: dict[tuple[type, ...], list[int]] = {}
        for place, row in enumerate(rows):
            groups.setdefault(tuple(map(type, row)), []).append(place)
        done = [b""] * len(rows)
        for like, places in groups.items():
            values = list(chain.from_iterable([rows[place] for place in places]))
            for place, row in zip(places, self._alike(values, like, len(places)), strict=True):
                done[place] = row
        return done

    def _alike(self, values: list[Field], kinds: Sequence[type], count: int) -> list[bytes]:
        """Encode rows whose columns each hold one type, given as one list of values, row after row."""
        frame: list[str] = []
        filled: list[int] = []
        opening = '{"fields":{'
        for i, name in self._names:
            if kinds[i] is not type(None):
                filled.append(i)
                frame += (opening + name, "")
                opening = ","
        # No text within a row holds a line feed unescaped, so that line feeds can part the rows.
        frame.append((self._tail if filled else opening + self._tail) + "\n")
        parts = frame * count
        for slot, i in enumerate(filled):
            column = values[i :: self._width]
            parts[2 * slot + 1 :: len(frame)] = _COLUMN_TEXTS.get(kinds[i], _mixed)(column)
        return _utf8("".join(parts)).split(b"\n")[:-1]


def _as_json(value: Field) -> Field:
    if isinstance(value, bytes):
        return value.hex()
    if isinstance(value, str | int | float):
        return value
    raise LedgerError(f"a {type(value).__name__} is not a field of a row")


def _utf8(text: str) -> bytes:
    try:
        return text.encode()
    except UnicodeEncodeError as error:
        raise surrogate_refusal(error) from None


def _text(value: Field) -> str:
    plain = _TEXTS.get(type(value))
    if plain:
        return plain(value)
    for kind in (str, int, float, bytes):
        if isinstance(value, kind):
            return _TEXTS[kind](value)
    raise LedgerError(f"a {type(value).__name__} is not a field of a row")


def _bool_text(value: bool) -> str:
    return "true" if value else "false"


def _bytes_text(value: bytes) -> str:
    return f'"{value.hex()}"'


def _integers(column: list[int]) -> list[str]:
    texts = list(map(repr, column))
    # 15 digits are always within bounds; longer ones need a look at each.
    if max(map(len, texts)) > 15:
        return list(map(integer_text, column))
    return texts


def _floats(column: list[float]) -> list[str]:
    lines = "\n".join(map(repr, column)) + "\n"
    # An exponent, "nan", "inf" or a zero, which may have a sign, needs a look at each.
    if "e" in lines or "n" in lines or 0.0 in column:
        return list(map(float_text, column))
    return lines.replace(".0\n", "\n").split("\n")[:-1]


def _strings(column: list[str]) -> list[str]:
    return list(map(encode_basestring, column))


def _mixed(column: list[Field]) -> list[str]:
    return list(map(_text, column))


_TEXTS: Final[Mapping[type, Callable[..., str]]] = {
    str: encode_basestring,
    int: integer_text,
    float: float_text,
    bool: _bool_text,
    bytes: _bytes_text,
}

_COLUMN_TEXTS: Final[Mapping[type, Callable[..., list[str]]]] = {
    str: _strings,
    int: _integers,
    float: _floats,
}
