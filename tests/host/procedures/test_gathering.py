"""Means over a stretch, and what their scatter is."""

from __future__ import annotations

import pytest

from sinkwright.procedures.gathering import time_mean


def test_a_slow_course_is_part_of_a_time_mean_and_not_its_uncertainty():
    falling = [12.0 - 0.01 * n for n in range(100)]
    mean = time_mean(falling, "voltage")
    assert mean.mean == pytest.approx(12.0 - 0.495)
    # Neighbours differ by 0.01 V: sqrt(0.01**2 / 2 / 100), derived by hand.
    assert mean.std_of_mean == pytest.approx(0.01 / 2**0.5 / 10)


def test_the_scatter_of_alternating_readings_is_that_of_independent_ones():
    mean = time_mean([1.0, -1.0] * 50, "current")
    assert mean.mean == 0.0
    assert mean.std_of_mean == pytest.approx((4 / 2 / 100) ** 0.5)
