import enum
import math
import struct

import pytest
import rfc8785
from hypothesis import given
from hypothesis import strategies as st

from sameline.ledger.canonical import MAX_INTEGER, canonical, float_text, parse_canonical, read_json
from sameline.ledger.errors import FormatError, LedgerError

# RFC 8785 appendix B: the bits of a double and its text.
APPENDIX_B = [
    ("0000000000000000", "0"),
    ("8000000000000000", "0"),
    ("0000000000000001", "5e-324"),
    ("8000000000000001", "-5e-324"),
    ("7fefffffffffffff", "1.7976931348623157e+308"),
    ("ffefffffffffffff", "-1.7976931348623157e+308"),
    ("4340000000000000", "9007199254740992"),
    ("c340000000000000", "-9007199254740992"),
    ("4430000000000000", "295147905179352830000"),
    ("44b52d02c7e14af5", "9.999999999999997e+22"),
    ("44b52d02c7e14af6", "1e+23"),
    ("44b52d02c7e14af7", "1.0000000000000001e+23"),
    ("444b1ae4d6e2ef4e", "999999999999999700000"),
    ("444b1ae4d6e2ef4f", "999999999999999900000"),
    ("444b1ae4d6e2ef50", "1e+21"),
    ("3eb0c6f7a0b5ed8c", "9.999999999999997e-7"),
    ("3eb0c6f7a0b5ed8d", "0.000001"),
    ("41b3de4355555553", "333333333.3333332"),
    ("41b3de4355555554", "333333333.33333325"),
    ("41b3de4355555555", "333333333.3333333"),
    ("41b3de4355555556", "333333333.3333334"),
    ("41b3de4355555557", "333333333.33333343"),
    ("becbf647612f3696", "-0.0000033333333333333333"),
    ("43143ff3c1cb0959", "1424953923781206.2"),
]

finite = st.floats(allow_nan=False, allow_infinity=False)
texts = st.text(st.characters(exclude_categories=("Cs",)))
values = st.recursive(
    st.none() | st.booleans() | st.integers(-MAX_INTEGER, MAX_INTEGER) | finite | texts,
    lambda inner: st.lists(inner, max_size=4) | st.dictionaries(texts, inner, max_size=4),
    max_leaves=20,
)


def double(bits: str):
    return struct.unpack(">d", bytes.fromhex(bits))[0]


@pytest.mark.parametrize(("bits", "text"), APPENDIX_B)
def test_numbers_are_written_as_appendix_b_of_rfc_8785_lists_them(bits: str, text: str):
    assert canonical(double(bits)) == text.encode()


@pytest.mark.parametrize("bits", ["7fffffffffffffff", "7ff0000000000000", "fff0000000000000"])
def test_nan_and_infinities_are_refused(bits: str):
    with pytest.raises(LedgerError, match="no canonical form"):
        canonical([double(bits)])


def test_example_of_rfc_8785_section_3_2_2():
    value = {
        "numbers": [333333333.33333329, 1e30, 4.50, 2e-3, 0.000000000000000000000000001],
        "string": "\u20ac$\u000f\u000aA'\u0042\u0022\u005c\\\"/",
        "literals": [None, True, False],
    }
    assert canonical(value).decode() == (
        '{"literals":[null,true,false],"numbers":[333333333.3333333,1e+30,4.5,0.002,1e-27],'
        '"string":"€$\\u000f\\nA\'B\\"\\\\\\\\\\"/"}'
    )


def test_members_are_ordered_by_utf_16_code_units_as_in_rfc_8785_section_3_2_3():
    value = {
        "\u20ac": "Euro Sign",
        "\r": "Carriage Return",
        "\ufb33": "Hebrew Letter Dalet With Dagesh",
        "1": "One",
        "\U0001f600": "Emoji: Grinning Face",
        "\u0080": "Control",
        "\u00f6": "Latin Small Letter O With Diaeresis",
    }
    assert list(parse_canonical(canonical(value)).values()) == [
        "Carriage Return",
        "One",
        "Control",
        "Latin Small Letter O With Diaeresis",
        "Euro Sign",
        "Emoji: Grinning Face",
        "Hebrew Letter Dalet With Dagesh",
    ]


def test_control_characters_are_escaped_as_in_rfc_8785_section_3_2_2_2():
    short = {"\b": "\\b", "\t": "\\t", "\n": "\\n", "\f": "\\f", "\r": "\\r"}
    for code in range(0x20):
        want = short.get(chr(code), f"\\u{code:04x}")
        assert canonical(chr(code)) == f'"{want}"'.encode()
    assert canonical("\x7f\u2028</") == '"\x7f\u2028</"'.encode()


@pytest.mark.parametrize(
    ("value", "text"),
    [(5.0, "5"), (1e-7, "1e-7"), (-0.0, "0"), (1e-5, "0.00001"), (1e16, "10000000000000000"), (1e20, "1" + "0" * 20)],
)
def test_floats_that_a_plain_json_dump_writes_otherwise(value: object, text: str):
    assert canonical(value) == text.encode()


@given(values)
def test_equals_the_reference_library_and_reads_back(value: object):
    data = canonical(value)
    assert data == rfc8785.dumps(value)
    assert parse_canonical(data) == value


@given(st.integers(0, 2**64 - 1))
def test_any_double_equals_the_reference_library_and_reads_back(bits: str):
    value = struct.unpack(">d", struct.pack(">Q", bits))[0]
    if math.isfinite(value):
        assert float_text(value).encode() == rfc8785.dumps(value)
        assert float(float_text(value)) == value


def test_every_power_of_ten_and_its_neighbours_equal_the_reference_library():
    for exponent in range(-324, 309):
        value = float(f"1e{exponent}")
        near = [value, -value, math.nextafter(value, 0), math.nextafter(value, math.inf)]
        for x in filter(math.isfinite, [*near, 1.5 * value, 12345.678 * value]):
            assert float_text(x).encode() == rfc8785.dumps(x)


def test_integers_beyond_exact_doubles_are_refused():
    assert canonical([MAX_INTEGER, -MAX_INTEGER]) == b"[9007199254740991,-9007199254740991]"
    for n in (MAX_INTEGER + 1, -MAX_INTEGER - 1, 10**400):
        with pytest.raises(LedgerError, match=r"2\*\*53"):
            canonical(n)


@pytest.mark.parametrize("value", ["\ud800", {"\udfff": 1}, ["a\ud83d"], {"a": "\ude00\ud83d"}])
def test_lone_surrogates_are_refused(value: object):
    with pytest.raises(LedgerError, match="lone surrogate U"):
        canonical(value)


@pytest.mark.parametrize("value", [b"ab", {1, 2}, {1: "a"}, {None: 1}, [object()], 1j, {"a": {"b": b""}}])
def test_what_is_not_json_is_refused(value: object):
    with pytest.raises(LedgerError):
        canonical(value)


def test_a_value_that_holds_itself_is_refused():
    value = []
    value.append(value)
    with pytest.raises(LedgerError, match="nested"):
        canonical(value)


def test_subclasses_are_written_by_their_value():
    class Grade(enum.StrEnum):
        A = "first"

    class Count(enum.IntEnum):
        TWO = 2

    class Size(float):
        def __repr__(self) -> str:
            return "Size"

    assert canonical([Grade.A, Count.TWO, Size(0.5)]) == b'["first",2,0.5]'


OTHER_SPELLINGS = [b"", b"{", b" 1", b"1 ", b"1.0", b"1e2", b"-0", b"01", b'{"b":1,"a":2}', b'{"a":1,"a":1}']
OTHER_SPELLINGS += [b'"\\u0041"', b"NaN", b"Infinity", b"1e999", b"\xff", b'"\\ud800"', b"\xef\xbb\xbf1"]
OTHER_SPELLINGS += [b"9007199254740993", b"1" + b"0" * 5000, b"[" * 100_000]


@pytest.mark.parametrize("data", OTHER_SPELLINGS, ids=range(len(OTHER_SPELLINGS)))
def test_another_spelling_is_not_canonical(data: bytes):
    with pytest.raises(FormatError):
        parse_canonical(data)


@given(values, st.data())
def test_reading_changed_bytes_gives_a_value_or_a_typed_refusal(value: object, data: st.DataObject):
    content = bytearray(canonical(value))
    start = data.draw(st.integers(0, len(content)))
    content[start : start + data.draw(st.integers(0, 3))] = data.draw(
        st.binary(max_size=3) | st.sampled_from([b",", b"\\ud800", b"1e999", b"-0", b"NaN", b'"', b"{}", b"[[", b"1e1"])
    )
    try:
        read = parse_canonical(bytes(content))
    except FormatError:
        return
    assert canonical(read) == content


def test_json_in_another_spelling_reads_if_it_says_one_thing():
    assert read_json(b' { "b" : [ 1.0, 1e2, -0 ], "a" : "\\u0041" } ') == {"a": "A", "b": [1, 100, 0]}
    for data in (b'{"a":1,"a":1}', b"NaN", b"[-Infinity]", b"", b"\xff", b"[" * 100_000, b"1 2"):
        with pytest.raises(FormatError):
            read_json(data)
