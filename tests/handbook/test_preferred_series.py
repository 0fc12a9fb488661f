"""The preferred number series of IEC 60063 as shipped, against the rule of the standard and its known deviations.

IEC 60063:2015: E48, E96 and E192 are round(100·10^(k/N)) with 920 in place of 919; E3 to E24 are an older table in which
eight figures of E24 deviate from round(10·10^(k/24)).
"""

import math

import pytest

from ampwarden.quantities import nearest_preferred, preferred_series

E24_DEVIATIONS = {26: 27, 29: 30, 32: 33, 35: 36, 38: 39, 42: 43, 46: 47, 83: 82}


@pytest.mark.parametrize("steps", [48, 96, 192])
def test_three_digit_series_follow_the_rounded_geometric_rule(steps):
    expected = [round(100 * 10 ** (k / steps)) for k in range(steps)]
    if steps == 192:
        expected[expected.index(919)] = 920
    assert list(preferred_series(f"E{steps}")) == expected


def test_e24_is_the_rounded_rule_with_eight_historic_deviations():
    geometric = [round(10 * 10 ** (k / 24)) for k in range(24)]
    assert list(preferred_series("E24")) == [E24_DEVIATIONS.get(step, step) for step in geometric]


@pytest.mark.parametrize(
    ("coarse", "fine"), [("E3", "E6"), ("E6", "E12"), ("E12", "E24"), ("E48", "E96"), ("E96", "E192")]
)
def test_coarser_series_is_every_second_value_of_the_finer_one(coarse, fine):
    assert preferred_series(fine)[::2] == preferred_series(coarse)


@pytest.mark.parametrize("series", ["E3", "E6", "E12", "E24", "E48", "E96", "E192"])
@pytest.mark.parametrize("value", [0.0468, 1.0, 9.95, 7200.0, 56.6e3, 9.99e8])
def test_nearest_preferred_value_is_nearest_by_ratio(series, value):
    found = nearest_preferred(value, series)
    decades = [10.0**power for power in range(-5, 12)]
    every = [step * decade for decade in decades for step in preferred_series(series)]
    best = min(abs(math.log(each / value)) for each in every)
    assert abs(math.log(found / value)) == pytest.approx(best, abs=1e-12)
