"""Units: is this text one, and what is a figure in it worth in another?

Conversion is exact: every factor is kept as a fraction of whole numbers and rounded once, at the end, to the nearest
double. Two units convert only when they measure the same quantity, which is more than having the same dimension:
a torque in N·m is no energy in J, an angle is no percentage, one hardness scale is no other.

Registering a unit asks the units library (pint) about a form of the text that this module has brought into order;
a file whose units are all the characteristic's own never loads the library.
"""

from __future__ import annotations

import re
from fractions import Fraction
from functools import cache, lru_cache
from typing import TYPE_CHECKING

from sameline.errors import CallError

if TYPE_CHECKING:
    import pint

# Scales are defined by a test method, not by physical units: nothing converts into them or out of them.
_SCALES = {
    "Shore A": ("shorea", "sha", "°sha", "°shorea"),
    "Shore B": ("shoreb", "shb"),
    "Shore C": ("shorec", "shc"),
    "Shore D": ("shored", "shd", "°shd", "°shored"),
    "Shore OO": ("shoreoo", "shore00", "shoo", "sh00"),
    "Shore AO": ("shoreao", "shorea0", "shao", "sha0"),
    "IRHD": ("irhd", "°irhd"),
    "Mooney": ("mooney", "mooneyunits"),
}
# Names so short that another case may be another unit: these hold as they are written.
_SCALE_SYMBOLS = {
    "MU": "Mooney",
    **{name: name for name in ("HRA", "HRB", "HRC", "HRM", "HRR", "HBW", "HV", "pH", "phr")},
}

# Spellings in use that the library does not know, or would read as something else ("Nm" as a number of metres).
_SPELLINGS = {
    "Nm": "N*m",
    "mNm": "mN*m",
    "cNm": "cN*m",
    "dNm": "dN*m",
    "kNm": "kN*m",
    "Nmm": "N*mm",
    "lbf-in": "lbf*inch",
    "lbf-ft": "lbf*ft",
    "mil": "thou",  # an angle to the library
    "kp": "kgf",
    "kp/cm^2": "kgf/cm^2",
    "kp/mm^2": "kgf/mm^2",
    "in": "inch",
    '"': "inch",
    "percent": "%",
    "deg C": "degC",
    "deg F": "degF",
    "° C": "degC",
    "° F": "degF",
    "-": "1",
    "wt%": "%",
}

# What the trade measures in, by the library's names. The library knows many more ("pcs" is a parsec to it).
_KNOWN = frozenset(
    re.findall(
        r"\w+",
        """
        meter gram second ampere kelvin mole candela minute hour day inch foot yard thou liter gallon
        pound ounce grain metric_ton newton dyne force_kilogram force_gram force_pound force_ounce kip
        kip_per_square_inch pound_force_per_square_inch pascal bar atmosphere standard_atmosphere
        technical_atmosphere torr meter_Hg joule watt watt_hour calorie british_thermal_unit horsepower
        volt ohm siemens farad coulomb henry tesla weber lux lumen hertz revolutions_per_minute revolution
        radian degree percent permille ppm ppb poise stokes degree_Celsius degree_Fahrenheit
        degree_Rankine delta_degree_Celsius delta_degree_Fahrenheit tex dtex denier angstrom micron barye
        becquerel gray
        """,
    )
)
_ENERGY = frozenset({"joule", "watt", "watt_hour", "calorie", "british_thermal_unit", "horsepower", "erg"})
_ANGLE = frozenset({"radian", "degree", "revolution", "revolutions_per_minute"})
_DECAY = frozenset({"becquerel"})
_DIFFERENCE = frozenset({"delta_degree_Celsius", "delta_degree_Fahrenheit"})
_EXAMPLES = (
    "MPa",
    "kPa",
    "Pa",
    "N/mm^2",
    "psi",
    "N",
    "kgf",
    "mm",
    "µm",
    "g/cm^3",
    "kN/m",
    "min",
    "°C",
    "%",
    "Shore A",
    "IRHD",
)

_SUPERSCRIPTS = str.maketrans("⁰¹²³⁴⁵⁶⁷⁸⁹⁻", "0123456789-")
_RAISED = re.compile(r"[⁻]?[⁰¹²³⁴-⁹]+")
_POWER = re.compile(r"(?<![A-Za-z^*])((?:[kcdmµnp]?m)|in|inch|ft|s)(-?[1-4])(?![0-9A-Za-z])")
_ALLOWED = re.compile(r"[A-Za-z0-9%°µΩΔÅ_^*/().\- ]{1,40}")


def plain_unit(text: str) -> str:
    """The unit's text with one spelling for powers, products and the micro sign, without blanks around signs.

    A scale comes back under its own name ("ShoreA" as "Shore A").
    """
    text = text.strip()
    scale = _scale(text)
    if scale:
        return scale
    text = _RAISED.sub(lambda found: "^" + found.group().translate(_SUPERSCRIPTS), text)
    text = text.replace("**", "^").replace("\u03bc", "µ").replace("\u2126", "Ω").replace("″", '"')
    text = re.sub(r"\s*([*×·⋅/])\s*", r"\1", text)
    text = re.sub(r"[×·⋅]", "*", text)
    text = _POWER.sub(r"\1^\2", text)
    return re.sub(r"\s+", " ", text)


@lru_cache(maxsize=1024)
def _scale(text: str) -> str | None:
    if text in _SCALE_SYMBOLS:
        return _SCALE_SYMBOLS[text]
    folded = re.sub(r"[\s\-_.]+", "", text).casefold()
    return next((name for name, spellings in _SCALES.items() if folded in spellings), None)


def same_unit(first: str, second: str) -> bool:
    """Whether two texts are one unit in two spellings ("N/mm2" and "N/mm²"); no unit is computed."""
    return first == second or _spelled(plain_unit(first)) == _spelled(plain_unit(second))


def _spelled(plain: str) -> str:
    return _SPELLINGS.get(plain, plain)


@cache
def _library() -> pint.UnitRegistry[Fraction]:
    import pint

    return pint.UnitRegistry(non_int_type=Fraction, cache_folder=None)


@lru_cache(maxsize=1024)
def _parse(text: str) -> pint.Unit | str:
    """The unit of this text: the library's, or the name of a scale.

    Raises:
        CallError: it is none that is known here.
    """
    plain = plain_unit(text)
    if _scale(plain):
        return plain
    spelled = _spelled(plain)
    unit = None
    if _ALLOWED.fullmatch(spelled) and not re.search(r"\d{2}", spelled):
        try:
            unit = _library().parse_units("dimensionless" if spelled == "1" else spelled)
        except Exception:  # noqa: BLE001 - the library raises what its tokenizer and its arithmetic raise
            unit = None
    if unit is None or not _roots(unit) <= _KNOWN:
        raise CallError(f"{text!r} is not a unit known here", advice=_hint(plain))
    return unit


def _roots(unit: pint.Unit) -> set[str]:
    """The library's names of the units that make this one up, without prefixes."""
    library = _library()
    found = set()
    for name in unit._units:  # noqa: SLF001 - the library shows a unit's parts in no other way
        splits = library.parse_unit_name(name)
        roots = {root for _, root, _ in splits} or {name}
        found.add(next(iter(sorted(roots & _KNOWN)), min(roots)))
    return found


def _hint(plain: str) -> str:
    near = {example.casefold(): example for example in _EXAMPLES}.get(plain.casefold())
    if near:
        return f"did you mean {near!r}?"
    return "write it as the trade does, for example MPa, N/mm², %, Shore A, min; 1 for a figure without unit"


def check_unit(text: str) -> str:
    """The unit as it will be registered: the laboratory's own spelling, trimmed; scales by their name.

    Raises:
        CallError: the text is empty or is no unit known here.
    """
    text = text.strip()
    if not text:
        raise CallError("the unit is empty", advice="write 1 for a figure without unit")
    unit = _parse(text)
    return unit if isinstance(unit, str) else text


def is_unit(text: str) -> bool:
    """Whether a cell holds a unit, rather than a figure or another word."""
    try:
        return not text.isdigit() and bool(check_unit(text))
    except CallError:
        return False


@lru_cache(maxsize=1024)
def factors(text_unit: str, characteristic_unit: str) -> tuple[Fraction, Fraction]:
    """Slope and offset, exact, that turn a figure in `text_unit` into `characteristic_unit`.

    Factors are those of NIST SP 811 (2008), appendix B, through the exact definitions of the inch, the pound and
    standard gravity that they are rounded from.

    Raises:
        CallError: one of them is no unit, or they do not measure the same quantity.
    """
    if same_unit(text_unit, characteristic_unit):
        return Fraction(1), Fraction(0)
    source, target = _parse(text_unit), _parse(characteristic_unit)
    if isinstance(source, str) or isinstance(target, str):
        if source == target:
            return Fraction(1), Fraction(0)
        raise _not_the_same(text_unit, characteristic_unit)
    if source.dimensionality != target.dimensionality or _kind(source) != _kind(target):
        raise _not_the_same(text_unit, characteristic_unit)
    quantity = _library().Quantity
    offset = Fraction(quantity(Fraction(0), source).to(target).magnitude)
    return Fraction(quantity(Fraction(1), source).to(target).magnitude) - offset, offset


def _kind(unit: pint.Unit) -> tuple[bool, bool, bool, bool]:
    roots = _roots(unit)
    return bool(roots & _ENERGY), bool(roots & _ANGLE), bool(roots & _DECAY), roots <= _DIFFERENCE and bool(roots)


def _not_the_same(text_unit: str, characteristic_unit: str) -> CallError:
    return CallError(
        f"{text_unit!r} cannot be turned into {characteristic_unit!r}: they do not measure the same quantity",
        advice=f"give the figure in {characteristic_unit}",
    )


def convert(value: float | str | Fraction, text_unit: str, characteristic_unit: str) -> float:
    """The figure in the characteristic's unit, correctly rounded; unchanged when the units are the same.

    Args:
        value: the figure in `text_unit`; a text ("12.50") or a float is taken at its decimal digits.
        text_unit: the unit as it was written.
        characteristic_unit: the unit as it is registered.

    Raises:
        CallError: one of them is no unit, or they do not measure the same quantity.
    """
    exact = value if isinstance(value, Fraction) else Fraction(str(value))
    slope, offset = factors(text_unit, characteristic_unit)
    return float(exact * slope + offset)
