"""Quantities: units, engineering notation, preferred values."""

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from ampwarden.quantities import (
    engineering,
    nearest_names,
    nearest_preferred,
    parse_quantity,
    preferred_between,
    preferred_series,
)


@pytest.mark.parametrize(
    ("text", "unit", "expected"),
    [
        ("12 V", "V", 12.0),
        ("-40 degC", "degC", -40.0),
        ("1 %", "", 0.01),
        ("10nF", "F", 10e-9),
        ("4.7 kΩ", "ohm", 4700.0),
        ("4.7 kohm", "ohm", 4700.0),
        ("1.5 V/us", "V/s", 1.5e6),
        ("60 dB", "dB", 60.0),
        ("5 ms", "s", 5e-3),
        (0.5, "V", 0.5),
    ],
)
def test_quantity_with_unit_is_read_in_si_units(text, unit, expected):
    assert parse_quantity(text, unit) == pytest.approx(expected, rel=1e-15)


@pytest.mark.parametrize(
    ("text", "unit", "said"),
    [
        ("12", "V", "has no unit"),
        ("12 A", "V", "is not a number"),
        ("twelve", "V", "cannot read"),
        ("1 kilo", "ohm", "unknown unit"),
    ],
)
def test_wrong_quantity_says_what_is_expected(text, unit, said):
    with pytest.raises(ValueError, match=said):
        parse_quantity(text, unit)


@pytest.mark.parametrize(
    ("value", "unit", "expected"),
    [
        (4700, "ohm", "4.70 kΩ"),
        (999.96, "ohm", "1.00 kΩ"),
        (1e-7, "F", "100 nF"),
        (0.0471, "V", "47.1 mV"),
        (-4.7, "", "-4.70"),
        (1.7e6, "V/s", "1.70 V/µs"),
        (45.23, "deg", "45.2°"),
    ],
)
def test_engineering_notation_has_three_digits_and_a_unit(value, unit, expected):
    assert engineering(value, unit) == expected


@given(st.floats(min_value=1e-14, max_value=1e13))
def test_engineering_notation_reads_back_within_its_digits(value):
    assert parse_quantity(engineering(value, "V"), "V") == pytest.approx(value, rel=0.0051)


def test_ascii_notation_holds_no_other_sign():
    assert engineering(4700, "ohm", ascii=True) == "4.70 kohm"
    assert engineering(1e-6, "F", ascii=True) == "1.00 uF"


def test_e24_has_the_values_of_the_standard():
    # IEC 60063:2015, table of the E24 series
    assert preferred_series("E24") == (
        10, 11, 12, 13, 15, 16, 18, 20, 22, 24, 27, 30, 33, 36, 39, 43, 47, 51, 56, 62, 68, 75, 82, 91,
    )  # fmt: skip


@pytest.mark.parametrize(
    ("value", "series", "expected"),
    [(51600, "E96", 51100), (8.2e3, "E12", 8.2e3), (4.99, "E24", 5.1), (0.98e-9, "E6", 1e-9)],
)
def test_nearest_preferred_value(value, series, expected):
    assert nearest_preferred(value, series) == pytest.approx(expected, rel=1e-12)


@given(st.floats(min_value=1e-11, max_value=1e9), st.sampled_from(["E6", "E12", "E24", "E48", "E96"]))
def test_preferred_value_lies_within_the_step_of_its_series(value, series):
    step = 10 ** (1 / len(preferred_series(series)))
    assert abs(math.log(nearest_preferred(value, series) / value)) <= math.log(step) * 0.62


def test_preferred_values_rise_between_their_bounds():
    assert preferred_between(1000, 2200, "E6") == (1000.0, 1500.0, 2200.0)
    assert preferred_between(5, 1, "E6") == ()


def test_nearest_name_ignores_case():
    assert nearest_names("OUTPUT-NEAR-RAIL", ["output-near-rail", "input-unbiased"]) == ("output-near-rail",)
