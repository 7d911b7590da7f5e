"""The canonical form: RFC 8785 (JSON Canonicalization Scheme) bytes of a JSON value.

Two values that are equal as JSON have the same bytes, whoever writes them and in whatever language. Strings are
escaped as in RFC 8785 section 3.2.2.2, numbers written as ECMAScript writes them (3.2.2.3), object members ordered
by the UTF-16 code units of their names (3.2.3), and the text encoded as UTF-8 (3.2.4).

What has no such form is refused: NaN and the infinities, integers that a double cannot hold exactly
(RFC 7493 section 2.2), lone surrogates, and anything that is not JSON.
"""

from __future__ import annotations

import json
import math
from collections.abc import Mapping
from json.encoder import encode_basestring
from typing import NoReturn

from sameline.ledger.errors import FormatError, LedgerError

MAX_INTEGER = 2**53 - 1
"""The largest integer whose neighbours a double still tells apart from it (RFC 7493 section 2.2)."""


def canonical(value: object) -> bytes:
    """The RFC 8785 bytes of a JSON value.

    Args:
        value: None, bool, int, float, str, a list or tuple of values, or a mapping from str to values, to any depth
            that Python's stack allows.

    Returns:
        UTF-8 bytes, without white space and without a final newline.

    Raises:
        LedgerError: the value, or a part of it, has no canonical form.
    """
    parts: list[str] = []
    try:
        _write(value, parts)
        return "".join(parts).encode()
    except UnicodeEncodeError as error:
        raise surrogate_refusal(error) from None
    except RecursionError:
        raise LedgerError("the value is nested too deeply to have a canonical form") from None


def parse_canonical(data: bytes) -> object:
    """Read canonical bytes back, and refuse any bytes that are not the canonical form of what they say.

    Args:
        data: what `canonical` wrote.

    Returns:
        The JSON value. A number written without point and exponent comes back as an int where it is within
        `MAX_INTEGER`, else as a float.

    Raises:
        FormatError: not UTF-8, not JSON, or another spelling of the same JSON.
    """
    value = read_json(data)
    try:
        again = canonical(value)
    except LedgerError as error:
        raise FormatError(error.message) from None
    if again != data:
        raise FormatError("JSON, but not in canonical form (RFC 8785)")
    return value


def read_json(data: bytes) -> object:
    """Read JSON, in any spelling that says one thing only.

    Raises:
        FormatError: not UTF-8, not JSON (RFC 8259), NaN or an infinity, or an object with two members of one name.
    """
    try:
        return json.loads(data.decode(), object_pairs_hook=_members, parse_constant=_no_constant, parse_int=_integer)
    except (ValueError, RecursionError) as error:
        raise FormatError(f"not JSON: {error}") from None


def float_text(x: float) -> str:
    """A finite double as ECMAScript writes it (ECMA-262, Number::toString, radix 10).

    Python's repr finds the same shortest digits; only their lay-out differs: 5.0 is `5`, 1e-07 is `1e-7`,
    1e-05 is `0.00001`, 1e+20 is written out in full, and minus zero is `0`.

    Raises:
        LedgerError: NaN or an infinity.
    """
    text = float.__repr__(x)
    if "e" in text:
        return _laid_out(text)
    if text[-2:] == ".0":
        return text[:-2] if x else "0"
    if not math.isfinite(x):
        raise LedgerError(f"{text} has no canonical form", advice="record a missing value as missing")
    return text


def integer_text(n: int) -> str:
    """An integer in decimal.

    Raises:
        LedgerError: beyond `MAX_INTEGER` either way.
    """
    if -MAX_INTEGER <= n <= MAX_INTEGER:
        return int.__repr__(n)
    raise LedgerError("an integer beyond 2**53 - 1 has no canonical form", advice="record it as text")


def utf16_order(name: str) -> bytes:
    """The sort key of a member's name: its UTF-16 code units, big-endian (RFC 8785 section 3.2.3)."""
    return name.encode("utf-16-be")


def surrogate_refusal(error: UnicodeEncodeError) -> LedgerError:
    """The refusal of a text that is not Unicode."""
    found = ord(error.object[error.start])
    return LedgerError(f"a text holds the lone surrogate U+{found:04X}, which no encoding can carry")


def _write(value: object, parts: list[str]) -> None:
    if isinstance(value, str):
        parts.append(encode_basestring(value))
    elif value is None:
        parts.append("null")
    elif isinstance(value, bool):
        parts.append("true" if value else "false")
    elif isinstance(value, int):
        parts.append(integer_text(value))
    elif isinstance(value, float):
        parts.append(float_text(value))
    elif isinstance(value, list | tuple):
        _write_array(value, parts)
    elif isinstance(value, Mapping):
        _write_object(value, parts)
    else:
        raise LedgerError(f"a {type(value).__name__} has no canonical form")


def _write_array(items: list[object] | tuple[object, ...], parts: list[str]) -> None:
    separator = "["
    for item in items:
        parts.append(separator)
        _write(item, parts)
        separator = ","
    parts.append("]" if items else "[]")


def _write_object(members: Mapping[object, object], parts: list[str]) -> None:
    names = []
    for name in members:
        if not isinstance(name, str):
            raise LedgerError(f"a member's name must be text, not {type(name).__name__}")
        names.append(name)
    separator = "{"
    for name in sorted(names, key=utf16_order):
        parts += (separator, encode_basestring(name), ":")
        _write(members[name], parts)
        separator = ","
    parts.append("}" if names else "{}")


def _laid_out(text: str) -> str:
    """Lay out Python's `d.ddde±xx` as ECMAScript does."""
    mantissa, exponent_text = text.split("e")
    exponent = int(exponent_text)
    sign, digits = ("-", mantissa[1:]) if mantissa[0] == "-" else ("", mantissa)
    digits = digits.replace(".", "")
    if 0 <= exponent < 21:
        return sign + digits.ljust(exponent + 1, "0")
    if -7 < exponent < 0:
        return sign + "0." + "0" * (-exponent - 1) + digits
    return f"{mantissa}e{exponent:+d}"


def _members(pairs: list[tuple[str, object]]) -> dict[str, object]:
    members = dict(pairs)
    if len(members) != len(pairs):
        raise FormatError("a member's name occurs twice in one object")
    return members


def _no_constant(name: str) -> NoReturn:
    raise FormatError(f"{name} is not JSON")


def _integer(text: str) -> int | float:
    # Up to 17 digits hold every integer in range; longer ones are doubles written out in full.
    if len(text) <= 17 and -MAX_INTEGER <= int(text) <= MAX_INTEGER:
        return int(text)
    return float(text)
