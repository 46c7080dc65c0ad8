"""Quantities as people write them, and back."""

import math

import pytest

from engine.errors import QuantityError
from engine.units import LENGTHS, UNITS, display, format_length, format_quantity, parse_quantity, to_si

ROUNDING = 1e-14
"""Relative; a conversion is one or two multiplications."""


@pytest.mark.parametrize(
    ("text", "unit", "default", "expected"),
    [
        ("12 mm", "m", "m", 0.012),
        ("12", "m", "mm", 0.012),
        ("12", "m", "cm", 0.12),
        ("12", "m", "m", 12.0),
        ("2", "m", "in", 0.0508),
        ("1/2 in", "m", "mm", 0.0127),
        ("1 3/4 in", "m", "mm", 0.04445),
        ("1-3/4 in", "m", "mm", 0.04445),
        ("-1/2 in", "m", "mm", -0.0127),
        ("½ in", "m", "mm", 0.0127),
        ("1½ in", "m", "mm", 0.0381),
        ('3"', "m", "mm", 0.0762),
        ("1 ft", "m", "mm", 0.3048),
        ("12,5 mm", "m", "mm", 0.0125),
        (".5 m", "m", "mm", 0.5),
        ("1e-3 m", "m", "mm", 1e-3),
        ("−4 mm", "m", "mm", -0.004),
        ("  7mm ", "m", "m", 0.007),
        ("7 MM", "m", "m", 0.007),
        ("3 deg", "rad", "mm", math.radians(3)),
        ("3°", "rad", "mm", math.radians(3)),
        ("3", "rad", "mm", math.radians(3)),
        ("0.5 rad", "rad", "mm", 0.5),
        ("1/4 turn", "rad", "mm", math.pi / 2),
        ("2.5 %", "grade", "mm", 0.025),
        ("2.5", "grade", "mm", 0.025),
        ("-2.5%", "grade", "mm", -0.025),
        ("1:40", "grade", "mm", 0.025),
        ("1 in 40", "grade", "mm", 0.025),
        ("45 deg", "grade", "mm", 1.0),
        ("0.3", "ratio", "mm", 0.3),
        ("30 %", "ratio", "mm", 0.3),
        ("36 km/h", "m/s", "mm", 10.0),
        ("60 rpm", "rad/s", "mm", 2 * math.pi),
        ("3.2 GPa", "Pa", "mm", 3.2e9),
        ("1.18 g/cm3", "kg/m3", "mm", 1180.0),
        ("2.7 g", "kg", "mm", 0.0027),
    ],
)
def test_a_typed_quantity_is_read_in_si(text, unit, default, expected):
    assert parse_quantity(text, unit, default) == pytest.approx(expected, rel=ROUNDING)


@pytest.mark.parametrize(
    ("text", "unit", "sentence"),
    [
        ("", "m", '"" is not a number; write one such as 12'),
        ("abc", "m", '"abc" is not a number'),
        ("1/0 in", "m", '"1/0 in" is not a number'),
        ("nan", "m", '"nan" is not a number'),
        ("1 2", "m", '"2" is no unit for this quantity'),
        ("12 mmm", "m", '"mmm" is no unit for this quantity; the nearest known name is "mm".'),
        ("12 kg", "m", '"kg" is no unit for this quantity'),
        ("3 deg", "m", '"deg" is no unit for this quantity'),
        ("1e999", "m", '"1e999" is too large'),
        ("95 deg", "grade", "A slope of 95 deg is upright or more"),
    ],
)
def test_what_cannot_be_read_is_answered_in_words(text, unit, sentence):
    with pytest.raises(QuantityError) as caught:
        parse_quantity(text, unit)
    assert str(caught.value).startswith(sentence)


@pytest.mark.parametrize(
    ("value", "units", "expected"),
    [
        (0.0125, "mm", "12.5 mm"),
        (0.0125, "cm", "1.25 cm"),
        (0.0125, "m", "0.0125 m"),
        (0.0127, "in", "0.5 in"),
        (1.0, "mm", "1000 mm"),
        (0.0, "mm", "0 mm"),
        (-1e-9, "mm", "0 mm"),
        (0.123456, "mm", "123.46 mm"),
    ],
)
def test_a_length_is_written_in_the_units_of_the_design(value, units, expected):
    assert format_length(value, units) == expected


@pytest.mark.parametrize(
    ("value", "unit", "expected"),
    [
        (math.radians(3), "rad", "3 deg"),
        (0.025, "grade", "2.5 %"),
        (0.3, "ratio", "0.3"),
        (7830.0, "kg/m3", "7830 kg/m3"),
        (2.07e11, "Pa", "2.07e+11 Pa"),
        (0.016, "m", "16 mm"),
    ],
)
def test_a_quantity_is_written_with_its_unit(value, unit, expected):
    assert format_quantity(value, unit) == expected


@pytest.mark.parametrize("units", LENGTHS)
@pytest.mark.parametrize("unit", UNITS)
def test_what_is_shown_is_read_back(unit, units):
    number, word = display(0.37, unit, units)
    assert parse_quantity(f"{number!r} {word}", unit, units) == pytest.approx(0.37, rel=ROUNDING)
    assert to_si(number, unit, units) == pytest.approx(0.37, rel=ROUNDING)
