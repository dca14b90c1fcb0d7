"""Uncertain arithmetic keeps what is correlated; expanded intervals against known budgets."""

from __future__ import annotations

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from sinkwright.uncertainty.causes import Cause, Uncertain, expand

GAIN = Cause("gain", "rectangular", 0.003, remedy="calibrate")
OFFSET = Cause("offset", "rectangular", 0.02)
NOISE_1 = Cause("noise of the first", "normal", 0.001)
NOISE_2 = Cause("noise of the second", "normal", 0.001)


def reading(volt: float, noise: Cause) -> Uncertain:
    return Uncertain(volt, {GAIN: volt, OFFSET: 1.0, noise: 1.0})


def test_the_standard_uncertainty_of_each_shape() -> None:
    """Source: JCGM 100, 4.3.7 (a/sqrt 3), 4.3.9 (a/sqrt 6)."""
    assert Cause("", "rectangular", 1.0).standard == pytest.approx(1 / math.sqrt(3))
    assert Cause("", "triangular", 1.0).standard == pytest.approx(1 / math.sqrt(6))
    assert Cause("", "normal", 1.0).standard == 1.0
    assert Cause("", "t", 1.0, dof=4).standard == 1.0


def test_a_multimeters_specification_is_a_rectangle() -> None:
    """+-(0.5 % + 3 counts) at 5.000 V with counts of 1 mV: a = 28 mV, u = 16.2 mV (calculated)."""
    meter = Cause("specification", "rectangular", 0.005 * 5.0 + 3 * 0.001)
    assert Uncertain(5.0, {meter: 1.0}).standard == pytest.approx(0.0162, abs=5e-5)


def test_a_triangle_is_two_rectangles_of_half_its_width() -> None:
    triangle = expand(Uncertain(0.0, {Cause("", "triangular", 2.0): 1.0}))
    assert triangle.half_width == pytest.approx(2 * (1 - math.sqrt(0.05)), rel=0.002)


def test_a_budget_that_a_rectangle_dominates_has_k_near_the_rectangles_1_65() -> None:
    """Source: EA-4/02 example S9, hand-held multimeter at 100 V: U = 0.05 V, and k = 1.65 as for a rectangle
    of its resolution alone (figures from memory). The calibrator's part is then one of a second rectangle.
    """
    resolution = Cause("resolution of 0.1 V", "rectangular", 0.05)
    alone = expand(Uncertain(0.1, {resolution: 1.0}))
    assert alone.coverage_factor == pytest.approx(1.65, abs=0.01)
    calibrator = {
        Cause("calibrator", "normal", 0.001): 1.0,
        Cause("calibrator's specification", "rectangular", 0.011): 1.0,
    }
    found = expand(Uncertain(0.1, {resolution: 1.0, **calibrator}))
    assert f"{found.half_width:.2f}" == "0.05"
    assert found.coverage_factor is not None
    assert 1.65 < found.coverage_factor < 1.75


def test_a_difference_of_two_readings_is_better_than_either() -> None:
    first, second = reading(12.1, NOISE_1), reading(12.0, NOISE_2)
    difference = first - second
    assert difference.parts[OFFSET] == 0.0
    assert difference.parts[GAIN] == pytest.approx(0.1)
    assert expand(difference).half_width < expand(second).half_width / 10


def test_a_value_less_itself_is_exactly_nothing() -> None:
    value = reading(12.0, NOISE_1)
    assert (value - value).standard == 0.0
    assert expand(value - value).coverage_factor is None


def test_the_mean_of_many_readings_keeps_the_gains_error() -> None:
    many = [Uncertain(12.0, {GAIN: 12.0, Cause(f"noise {n}", "normal", 0.5): 1.0}) for n in range(100)]
    mean = sum(many, Uncertain.exact(0.0)) / len(many)
    assert mean.parts[GAIN] == pytest.approx(12.0)
    noise = {cause: s for cause, s in mean.parts.items() if cause != GAIN}
    assert Uncertain(0.0, noise).standard == pytest.approx(0.05)


def test_a_gain_that_two_values_share_cancels_in_their_ratio() -> None:
    ratio = Uncertain(12.0, {GAIN: 12.0}) / Uncertain(2.0, {GAIN: 2.0})
    assert ratio.value == 6.0
    assert ratio.standard == pytest.approx(0.0, abs=1e-15)


def test_load_regulation_and_output_resistance_of_a_stated_pair() -> None:
    """5.050 V falls to 4.950 V at 2 A: 2.02 % of the full-load voltage, 50 mohm (calculated)."""
    no_load, full_load, current = Uncertain.exact(5.05), Uncertain.exact(4.95), Uncertain.exact(2.0)
    assert ((no_load - full_load) / full_load * 100).value == pytest.approx(2.02, abs=0.001)
    assert ((no_load - full_load) / current).value == pytest.approx(0.05)


def test_numbers_may_stand_on_either_side() -> None:
    value = Uncertain(4.0, {OFFSET: 1.0})
    assert (1 + value).value == 5.0
    assert (1 - value).parts[OFFSET] == -1.0
    assert (2 * value).parts[OFFSET] == 2.0
    assert (8 / value).parts[OFFSET] == pytest.approx(-0.5)
    assert (-value).value == -4.0


_VALUES = st.floats(0.5, 50.0)


@given(_VALUES, _VALUES, _VALUES)
def test_sensitivities_are_the_derivatives(a: float, b: float, c: float) -> None:
    """Against a difference quotient of the same formula in plain numbers."""
    causes = [Cause(name, "normal", 1.0) for name in "abc"]

    def formula(x, y, z):
        return (x - y) / y * z + 1 / x - x * y

    inputs = [Uncertain(v, {cause: 1.0}) for v, cause in zip((a, b, c), causes, strict=True)]
    result = formula(*inputs)
    for index, cause in enumerate(causes):
        step = 1e-6
        up, down = [a, b, c], [a, b, c]
        up[index] += step
        down[index] -= step
        quotient = (formula(*up) - formula(*down)) / (2 * step)
        assert result.parts.get(cause, 0.0) == pytest.approx(quotient, rel=1e-5, abs=1e-4)


def test_contributions_come_largest_first_in_the_values_own_unit() -> None:
    value = reading(10.0, NOISE_1)
    found = expand(value)
    assert [c.cause for c in found.contributions] == ["gain", "offset", "noise of the first"]
    assert found.contributions[0].standard == pytest.approx(0.03 / math.sqrt(3))
    assert found.contributions[0].remedy == "calibrate"
    assert math.hypot(*(c.standard for c in found.contributions)) == pytest.approx(found.standard)


def test_the_value_without_a_remedys_causes_keeps_the_others() -> None:
    rest = reading(10.0, NOISE_1).without("calibrate")
    assert set(rest.parts) == {OFFSET, NOISE_1}


@pytest.mark.parametrize(
    ("shape", "spread", "dof", "says"),
    [
        ("square", 1.0, 5.0, "no shape"),
        ("normal", -1.0, 5.0, "no size"),
        ("normal", math.nan, 5.0, "no size"),
        ("rectangular", math.inf, 5.0, "no size"),
        ("t", 1.0, 0.0, "degrees of freedom"),
        ("t", 1.0, math.nan, "degrees of freedom"),
    ],
)
def test_a_cause_that_cannot_be_is_refused(shape: str, spread: float, dof: float, says: str) -> None:
    with pytest.raises(ValueError, match=says):
        Cause("cause", shape, spread, dof)


def test_t_with_endless_degrees_of_freedom_is_normal() -> None:
    assert expand(Uncertain(0.0, {Cause("", "t", 1.0): 1.0})).half_width == pytest.approx(1.959964)
