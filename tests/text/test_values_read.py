"""Values as netlists write them; what is printed parses back."""

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from ampwarden.quantities import engineering, parse_quantity
from ampwarden.text import read_value


# suffixes: SPICE3 Version 3f3 User's Manual, Berkeley, 1993
@pytest.mark.parametrize(
    ("text", "value"),
    [
        ("1", 1.0), ("1k", 1e3), ("1K", 1e3), ("1MEG", 1e6), ("1Meg", 1e6), ("1M", 1e-3), ("1m", 1e-3), ("1MIL", 25.4e-6),
        ("1u", 1e-6), ("10µ", 10e-6), ("1n", 1e-9), ("1p", 1e-12), ("1f", 1e-15), ("1g", 1e9), ("1t", 1e12), ("1e3", 1e3),
        ("1.5e-3k", 1.5), (".1", 0.1), ("-4.7k", -4700.0), ("100nF", 100e-9), ("12V", 12.0), ("4.7kΩ", 4700.0),
    ],
)  # fmt: skip
def test_suffix(text, value):
    assert read_value(text) == pytest.approx(value, rel=1e-12)


# marking codes: IEC 60062:2016
@pytest.mark.parametrize(
    ("text", "kind", "value"),
    [
        ("4k7", "R", 4700.0),
        ("R47", "R", 0.47),
        ("2n2", "C", 2.2e-9),
        ("4R7", "R", 4.7),
        ("1M5", "R", 1.5e6),
        ("4u7", "C", 4.7e-6),
    ],
)
def test_marking_code(text, kind, value):
    assert read_value(text, kind) == pytest.approx(value, rel=1e-12)


@pytest.mark.parametrize("text", ["", "ten", "k1", "1e400", "--1", "1..2"])
def test_what_is_no_value_is_none(text):
    found = read_value(text)
    assert found is None or math.isfinite(found)


@given(st.floats(min_value=1e-11, max_value=1e11))
def test_printed_quantity_parses_back_to_its_three_digits(value):
    assert parse_quantity(engineering(value, "V"), "V") == pytest.approx(value, rel=6e-3)


@given(st.floats(min_value=1e-200, max_value=1e200))
def test_plain_number_is_read_as_python_writes_it(value):
    assert read_value(repr(value)) == pytest.approx(value, rel=1e-12, abs=1e-290)
