"""Conversion factors against NIST Special Publication 811 (2008 edition), appendix B, "Factors for units"."""

from __future__ import annotations

import subprocess
import sys
from fractions import Fraction

import pytest
from hypothesis import given
from hypothesis import strategies as st

from sameline.errors import CallError
from sameline.intake.units import check_unit, convert, factors, same_unit

# To convert from / to / multiply by, as printed in SP 811, appendix B.8 (alphabetical) and B.9 (by quantity).
# Figures printed in bold there are exact; the others are given to seven digits.
EXACT = [
    ("kgf", "N", "9.80665"),
    ("kgf/cm²", "Pa", "98066.5"),
    ("kgf/mm²", "Pa", "9806650"),
    ("kgf/m²", "Pa", "9.80665"),
    ("in", "mm", "25.4"),
    ("in", "cm", "2.54"),
    ("ft", "m", "0.3048"),
    ("mil", "mm", "0.0254"),
    ("yd", "m", "0.9144"),
    ("min", "s", "60"),
    ("h", "s", "3600"),
    ("d", "s", "86400"),
    ("bar", "kPa", "100"),
    ("atm", "Pa", "101325"),
    ("dyn", "N", "0.00001"),
    ("cP", "Pa·s", "0.001"),
    ("cSt", "m²/s", "0.000001"),
    ("t", "kg", "1000"),
    ("L", "m³", "0.001"),
    ("in²", "mm²", "645.16"),
    ("lb", "kg", "0.45359237"),
    ("N/mm²", "MPa", "1"),
    ("%", "1", "0.01"),
    ("g/cm³", "kg/m³", "1000"),
    ("kgf·m", "N·m", "9.80665"),
]
SEVEN_DIGITS = [
    ("psi", "Pa", "6.894757e3"),
    ("psi", "MPa", "6.894757e-3"),
    ("ksi", "MPa", "6.894757"),
    ("lbf", "N", "4.448222"),
    ("lbf/in", "N/m", "1.751268e2"),
    ("lbf/ft", "N/m", "1.459390e1"),
    ("lbf·in", "N·m", "1.129848e-1"),
    ("lbf·ft", "N·m", "1.355818"),
    ("lbf/ft²", "Pa", "4.788026e1"),
    ("kip", "N", "4.448222e3"),
    ("ozf", "N", "2.780139e-1"),
    ("oz", "g", "2.834952e1"),
    ("lb/ft³", "kg/m³", "1.601846e1"),
    ("lb/in³", "g/cm³", "2.767990e1"),
    ("mmHg", "Pa", "1.333224e2"),
    ("torr", "Pa", "1.333224e2"),
]


@pytest.mark.parametrize(("unit", "into", "factor"), EXACT)
def test_exact_factors_are_exact(unit: str, into: str, factor: str):
    assert factors(unit, into) == (Fraction(factor), 0)
    assert convert("12.5", unit, into) == float(Fraction("12.5") * Fraction(factor))


@pytest.mark.parametrize(("unit", "into", "factor"), SEVEN_DIGITS)
def test_other_factors_agree_to_all_printed_digits(unit: str, into: str, factor: str):
    assert f"{convert(1, unit, into):.6e}" == f"{float(factor):.6e}"


# SP 811, B.9 "Temperature": t/°C = (t/°F - 32)/1.8; T/K = t/°C + 273.15; T/K = (t/°F + 459.67)/1.8.
@pytest.mark.parametrize(
    ("value", "unit", "into", "result"),
    [
        ("32", "°F", "°C", 0.0),
        ("212", "°F", "°C", 100.0),
        ("70", "degF", "degC", float((Fraction(70) - 32) / Fraction("1.8"))),
        ("23", "°C", "°F", 73.4),
        ("23", "°C", "K", 296.15),
        ("-459.67", "°F", "K", 0.0),
        ("10", "K/min", "°C/min", 10.0),
        ("18", "Δ°F", "Δ°C", 10.0),
    ],
)
def test_temperatures_have_an_offset_and_their_differences_none(value: str, unit: str, into: str, result: float):
    assert convert(value, unit, into) == result


@pytest.mark.parametrize(
    ("unit", "registered"),
    [
        ("Shore A", "Shore A"),
        ("ShoreA", "Shore A"),
        ("shore-a", "Shore A"),
        ("Sh A", "Shore A"),
        ("Shore D", "Shore D"),
        ("IRHD", "IRHD"),
        ("irhd", "IRHD"),
        ("HRC", "HRC"),
        ("MU", "Mooney"),
        ("pH", "pH"),
        (" N/mm² ", "N/mm²"),
        ("N/mm2", "N/mm2"),
        ("kgf", "kgf"),
        ("psi", "psi"),
        ("%", "%"),
        ("1", "1"),
        ("dNm", "dNm"),
        ("mPa·s", "mPa·s"),
    ],
)
def test_a_unit_is_registered_as_the_laboratory_writes_it_and_a_scale_by_its_name(unit: str, registered: str):
    assert check_unit(unit) == registered


@pytest.mark.parametrize(
    "unit",
    [
        "",
        " ",
        "furlong",
        "pcs",
        "MPa)",
        "()",
        "N//",
        "m**999999999",
        "2 mm",
        "mm; import os",
        "x" * 500,
        "\0",
        "N/0",
        "±",
        "=1",
    ],
)
def test_what_is_no_unit_is_refused(unit: str):
    with pytest.raises(CallError):
        check_unit(unit)


def test_a_slip_in_case_is_named():
    with pytest.raises(CallError, match="did you mean 'MPa'"):
        check_unit("Mpa")


@pytest.mark.parametrize(
    ("unit", "into"),
    [
        ("Shore A", "Shore D"),
        ("Shore A", "IRHD"),
        ("Shore A", "1"),
        ("IRHD", "%"),
        ("MPa", "mm"),
        ("kg", "N"),
        ("kg/cm²", "MPa"),
        ("N·m", "J"),
        ("N/mm", "kJ/m²"),
        ("rad", "%"),
        ("Δ°C", "°C"),
        ("Bq", "Hz"),
        ("rpm", "Hz"),
    ],
)
def test_units_of_different_quantities_are_refused_both_ways(unit: str, into: str):
    for pair in ((unit, into), (into, unit)):
        with pytest.raises(CallError, match="do not measure the same quantity"):
            convert(1, *pair)


@pytest.mark.parametrize(
    ("first", "second"),
    [
        ("N/mm²", "N/mm2"),
        ("N/mm^2", "N / mm**2"),
        ("µm", "\u03bcm"),
        ("N·mm", "N*mm"),
        ("ShoreA", "shore a"),
        ("s⁻¹", "s^-1"),
    ],
)
def test_spellings_of_one_unit(first: str, second: str):
    assert same_unit(first, second)
    assert not same_unit(first, "kPa")


@given(
    st.decimals(-10_000, 10_000, places=4), st.sampled_from([("psi", "MPa"), ("°F", "°C"), ("kgf", "N"), ("in", "mm")])
)
def test_there_and_back_is_the_same_figure(value: object, pair: tuple[str, str]):
    there = convert(str(value), *pair)
    assert convert(Fraction(there), pair[1], pair[0]) == pytest.approx(float(str(value)), rel=1e-14, abs=1e-11)


def test_files_in_the_characteristics_own_units_do_not_load_the_units_library():
    code = """
import sys
from sameline.intake.files import read_files
from sameline.intake.rawfiles import RawFile
from sameline.records.drafts import CharacteristicFacts, Register
facts = {"TS": CharacteristicFacts("TS", "N/mm²"), "HA": CharacteristicFacts("HA", "Shore A")}
register = Register({"B": "M"}, facts, frozenset(), frozenset(), "UTC", "2026-12-01T00:00:00.000000Z")
text = "batch,characteristic,tested_at,value\\nB,TS,2026-03-04,12 N/mm2\\nB,HA,2026-03-04,60 ShoreA\\n"
intake = read_files([RawFile("x.csv", text.encode())], register)
assert len(intake.runs) == 2 and not intake.findings, intake
heavy = {"pint", "pandas", "openpyxl", "scipy", "numpy", "python_calamine", "sqlalchemy"} & set(sys.modules)
assert not heavy, heavy
"""
    subprocess.run([sys.executable, "-c", code], check=True, timeout=60)
