"""Means of readings: how many of them count, and how far the mean may be off."""

from __future__ import annotations

import math
from random import Random

import pytest

from sinkwright.uncertainty.averaging import average


def correlated(count: int, correlation: float, draw: Random) -> list[float]:
    """A first-order autoregression of unit variance."""
    values = [draw.gauss(0, 1)]
    fresh = math.sqrt(1 - correlation**2)
    for _ in range(count - 1):
        values.append(correlation * values[-1] + fresh * draw.gauss(0, 1))
    return values


def test_independent_readings_give_s_over_root_n() -> None:
    """Source: JCGM 100, 4.2.3; numbers that alternate have no positive correlation."""
    found = average([1.0, 3.0, 1.0, 3.0, 1.0, 3.0, 1.0, 3.0], "x")
    assert found.mean == 2.0
    assert found.n == 8
    assert found.std_of_mean == pytest.approx(math.sqrt(8 / 7) / math.sqrt(8))
    assert found.label == "x"


def test_correlated_readings_count_as_fewer() -> None:
    """Source: for a first-order autoregression, n/n_eff tends to (1 + r)/(1 - r): 4 for r = 0.6."""
    found = average(correlated(4000, 0.6, Random(1)), "x")
    assert found.n == pytest.approx(1000, rel=0.15)
    assert found.std_of_mean == pytest.approx(1 / math.sqrt(1000), rel=0.12)


def test_independent_readings_keep_their_number() -> None:
    assert average(correlated(4000, 0.0, Random(2)), "x").n > 3300


def test_a_slow_drift_is_worth_few_readings() -> None:
    assert average([0.001 * k for k in range(40)], "x").n <= 8


@pytest.mark.parametrize("correlation", [0.0, 0.5])
def test_the_scatter_of_means_is_what_their_deviations_say(correlation: float) -> None:
    """Oracle: means of 300 seeded series, whose true mean is nothing, in units of the deviation found."""
    draw = Random(3)
    found = [average(correlated(60, correlation, draw), "x") for _ in range(300)]
    normalised = [a.mean / a.std_of_mean for a in found]
    assert math.sqrt(sum(z * z for z in normalised) / len(found)) == pytest.approx(1.0, abs=0.2)


def test_readings_that_never_differ_have_no_scatter() -> None:
    found = average([4.0] * 5, "x")
    assert (found.std_of_mean, found.n) == (0.0, 5)


def test_one_reading_tells_nothing_of_its_scatter() -> None:
    found = average([4.0], "x")
    assert (found.mean, found.std_of_mean, found.n) == (4.0, 0.0, 1)


def test_two_readings_are_worth_two() -> None:
    found = average([1.0, 2.0], "x")
    assert (found.n, found.std_of_mean) == (2, pytest.approx(0.5))


@pytest.mark.parametrize("values", [[], [1.0, math.nan], [math.inf]])
def test_what_has_no_mean_is_refused(values: list[float]) -> None:
    with pytest.raises(ValueError, match=r"no mean|no number"):
        average(values, "x")
