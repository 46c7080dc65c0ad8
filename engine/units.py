"""Units at the edges: SI inside, millimetres, inches, degrees and per cent where a person reads or types.

The unit of a quantity is named in SI ("m", "rad", "m/s", ...), or is "grade" (a slope, shown in per cent) or
"ratio" (a plain number). The length unit of a design (mm, cm, m, in) decides how lengths are shown and what a bare
number means.
"""

import math
import re
from typing import NamedTuple

from engine.errors import QuantityError, suggestion

INCH = 0.0254
"""m, exact (international yard and pound agreement, 1959)."""
DEGREE = math.pi / 180.0

LENGTHS = {"mm": 1e-3, "cm": 1e-2, "m": 1.0, "in": INCH}
"""Units in which a design may show lengths, in m."""

DECIMALS = {"mm": 2, "cm": 3, "m": 5, "in": 4}
"""Decimals of a shown length: about a hundredth of a millimetre in each unit."""
ANGLE_DECIMALS = 2
GRADE_DECIMALS = 3
PLAIN_DIGITS = 6
"""Digits of a shown ratio, density, modulus."""


class Unit(NamedTuple):
    """A unit that may be typed: its size in SI and the SI unit of its quantity."""

    size: float
    quantity: str


_LENGTH_WORDS = {
    **{"m": 1.0, "metre": 1.0, "metres": 1.0, "meter": 1.0, "meters": 1.0, "cm": 1e-2, "mm": 1e-3},
    **{"um": 1e-6, "µm": 1e-6, "μm": 1e-6, "km": 1e3},
    **{
        "in": INCH,
        "inch": INCH,
        "inches": INCH,
        '"': INCH,
        "″": INCH,
        "ft": 12 * INCH,
        "foot": 12 * INCH,
        "feet": 12 * INCH,
    },
    **{"'": 12 * INCH, "′": 12 * INCH},
}
_ANGLE_WORDS = {
    **{"rad": 1.0, "deg": DEGREE, "degree": DEGREE, "degrees": DEGREE, "°": DEGREE},
    **{"turn": 2 * math.pi, "turns": 2 * math.pi},
}
UNITS: dict[str, dict[str, float]] = {
    "m": _LENGTH_WORDS,
    "rad": _ANGLE_WORDS,
    "turns": {"turn": 1.0, "turns": 1.0, "deg": 1 / 360, "°": 1 / 360, "rad": 0.5 / math.pi},
    "ratio": {"%": 1e-2, "percent": 1e-2, "‰": 1e-3},
    "grade": {"%": 1e-2, "percent": 1e-2, "‰": 1e-3},
    "m/s": {"m/s": 1.0, "mm/s": 1e-3, "cm/s": 1e-2, "km/h": 1 / 3.6, "in/s": INCH, "ft/s": 12 * INCH},
    "rad/s": {"rad/s": 1.0, "rpm": 2 * math.pi / 60, "1/min": 2 * math.pi / 60, "deg/s": DEGREE, "°/s": DEGREE},
    "1/m": {"1/m": 1.0, "1/mm": 1e3, "1/cm": 1e2, "1/in": 1 / INCH},
    "kg/m3": {"kg/m3": 1.0, "kg/m³": 1.0, "g/cm3": 1e3, "g/cm³": 1e3},
    "Pa": {"Pa": 1.0, "kPa": 1e3, "MPa": 1e6, "GPa": 1e9, "N/mm2": 1e6, "N/mm²": 1e6},
    "s": {"s": 1.0, "ms": 1e-3, "min": 60.0},
    "kg": {"kg": 1.0, "g": 1e-3, "oz": 0.028349523125, "lb": 0.45359237},
    "N": {"N": 1.0, "mN": 1e-3, "kN": 1e3},
    "J": {"J": 1.0, "mJ": 1e-3},
}
"""Words for units of each quantity, with their size in SI. Pound and ounce: exact, same agreement as the inch."""

_BARE = {"rad": DEGREE, "grade": 1e-2}
"""What a number without a unit means where that is not SI: degrees for an angle, per cent for a grade."""
_NUMBER = r"[+-]?(?:\d+(?:[.,]\d*)?|[.,]\d+)(?:[eE][+-]?\d+)?"
_FRACTION = re.compile(r"^\s*([+-]?)\s*(?:(\d+)(?:\s+|\s*-\s*))?(\d+)\s*/\s*(\d+)\s*(.*?)\s*$")
_PLAIN = re.compile(rf"^\s*({_NUMBER})\s*(.*?)\s*$")
_SLOPE = re.compile(rf"^\s*({_NUMBER})\s*(?::|in)\s*({_NUMBER})\s*$")
_MINUS = str.maketrans({"−": "-", "–": "-", "\u00a0": " ", "\u202f": " ", "½": " 1/2", "¼": " 1/4", "¾": " 3/4"})


def parse_quantity(text: str, unit: str, default_units: str = "mm") -> float:
    """Read a typed quantity.

    Parameters
    ----------
    text : such as "12 mm", "1/2 in", "1 3/4 in", "3 deg", "2.5 %", "1:40" (a grade), "12,5"
    unit : SI unit of the quantity, "grade" or "ratio"
    default_units : length unit of a bare number (mm, cm, m, in); a bare angle is in degrees, a bare grade in per cent

    Returns
    -------
    float
        In SI.

    Raises
    ------
    QuantityError
        When the number or its unit cannot be read.
    """
    plain = text.translate(_MINUS)
    slope = _SLOPE.match(plain) if unit == "grade" else None
    if slope is not None and _number(slope.group(2)) != 0.0:
        value = _number(slope.group(1)) / _number(slope.group(2))
    else:
        number, word = _split(plain, text)
        by_angle = unit == "grade" and word in _ANGLE_WORDS
        value = _grade_of_angle(number, word) if by_angle else number * _size(word, unit, default_units)
    if not math.isfinite(value):
        raise QuantityError(f'"{text}" is too large; give a number of a usual size.')
    return value


def _split(plain: str, text: str) -> tuple[float, str]:
    """Number and unit word of a typed quantity."""
    fraction = _FRACTION.match(plain)
    if fraction is not None and int(fraction.group(4)) != 0:
        sign, whole, above, below, word = fraction.groups()
        value = int(whole or 0) + int(above) / int(below)
        return (-value if sign == "-" else value), word
    match = _PLAIN.match(plain)
    if match is None or (fraction is not None and int(fraction.group(4)) == 0):
        raise QuantityError(f'"{text}" is not a number; write one such as 12, 12.5 mm, 1/2 in, 3 deg or 2.5 %.')
    return _number(match.group(1)), match.group(2)


def _number(text: str) -> float:
    """Number with a decimal point or comma."""
    return float(text.replace(",", "."))


def _grade_of_angle(number: float, word: str) -> float:
    """Grade of a slope given by its angle."""
    angle = number * _ANGLE_WORDS[word]
    if not abs(angle) < 0.5 * math.pi:
        raise QuantityError(f"A slope of {number:g} {word} is upright or more; give less than 90 degrees.")
    return math.tan(angle)


def _size(word: str, unit: str, default_units: str) -> float:
    """Size in SI of a unit word, or of the unit that a bare number has."""
    if not word:
        return LENGTHS[default_units] if unit == "m" else _BARE.get(unit, 1.0)
    known = UNITS.get(unit, {})
    found = known.get(word)
    if found is None:
        found = next((size for name, size in known.items() if name.casefold() == word.casefold()), None)
    if found is None:
        raise QuantityError(f'"{word}" is no unit for this quantity{suggestion(word, known, len(known))}.')
    return found


def format_length(value: float, units: str = "mm") -> str:
    """Write a length (m) in a length unit, with the unit."""
    return f"{_trimmed(value / LENGTHS[units], DECIMALS[units])} {units}"


def format_quantity(value: float, unit: str, units: str = "mm") -> str:
    """Write a quantity given in SI as a person reads it, with its unit; `units` is the length unit."""
    number, word = display(value, unit, units)
    digits = {"m": DECIMALS.get(units, PLAIN_DIGITS), "rad": ANGLE_DECIMALS, "grade": GRADE_DECIMALS}.get(unit)
    text = f"{number:.{PLAIN_DIGITS}g}" if digits is None else _trimmed(number, digits)
    return f"{text} {word}".rstrip()


def display(value: float, unit: str, units: str = "mm") -> tuple[float, str]:
    """Number and unit word in which a quantity given in SI is shown."""
    if unit == "m":
        return value / LENGTHS[units], units
    if unit == "rad":
        return value / DEGREE, "deg"
    if unit == "grade":
        return value * 100.0, "%"
    return value, "" if unit == "ratio" else unit


def to_si(number: float, unit: str, units: str = "mm") -> float:
    """SI value of a shown number, the inverse of `display`."""
    return number * (LENGTHS[units] if unit == "m" else _BARE.get(unit, 1.0))


def _trimmed(value: float, decimals: int) -> str:
    """Number with at most so many decimals, without trailing zeros and without a negative zero."""
    text = f"{value:.{decimals}f}"
    if "." in text:
        text = text.rstrip("0").rstrip(".")
    return "0" if text == "-0" else text
