"""What sampling leaves of ripple, against a simulation of the sampling itself."""

from __future__ import annotations

import math

import pytest

from sinkwright.uncertainty.ripple import alias_bound, worst_mains_bound

#: 860 conversions a second, each averaging over its whole window.
WINDOW_s = 1 / 860


def sawtooth_mean(start_s: float, length_s: float, frequency_Hz: float) -> float:
    """Mean over a window of a sawtooth from -0.5 to 0.5, by its antiderivative."""

    def integral(t: float) -> float:
        turns = t * frequency_Hz
        whole = math.floor(turns)
        rest = turns - whole
        return (rest * rest - rest) / 2 / frequency_Hz

    return (integral(start_s + length_s) - integral(start_s)) / length_s


def worst_mean_error(interval_s: float, samples: int, frequency_Hz: float) -> float:
    """Largest error of the mean over 200 phases, for a peak-to-peak of one."""
    period_s = 1 / frequency_Hz
    means = []
    for phase in range(200):
        start_s = period_s * phase / 200
        times = (start_s + k * interval_s for k in range(samples))
        means.append(sum(sawtooth_mean(t, WINDOW_s, frequency_Hz) for t in times) / samples)
    return max(abs(mean) for mean in means)


@pytest.mark.parametrize(("interval_s", "samples", "worst_mV"), [(0.005, 200, 19.0), (0.0047, 213, 0.3)])
def test_a_hundred_millivolts_of_100_Hz_sawtooth(interval_s: float, samples: int, worst_mV: float) -> None:
    """Source: reference figures for 1 s of such ripple: +-19 mV for ever at 5.0 ms, +-0.3 mV at 4.7 ms."""
    seen_mV = 100 * worst_mean_error(interval_s, samples, 100.0)
    assert seen_mV == pytest.approx(worst_mV, rel=0.25)
    bound_mV = 100 * alias_bound(1.0, 100.0, interval_s=interval_s, window_s=WINDOW_s, samples=samples)
    assert seen_mV <= bound_mV <= 3.5 * seen_mV


@pytest.mark.parametrize("frequency_Hz", [50.0, 60.0, 100.0, 120.0])
@pytest.mark.parametrize("samples", [21, 213])
def test_the_bound_holds_at_every_mains_frequency(frequency_Hz: float, samples: int) -> None:
    worst = worst_mains_bound(1.0, interval_s=0.0047, window_s=WINDOW_s, samples=samples)
    assert worst_mean_error(0.0047, samples, frequency_Hz) <= worst


def test_time_does_not_help_where_a_harmonic_stands_still() -> None:
    short = alias_bound(1.0, 100.0, interval_s=0.005, window_s=WINDOW_s, samples=200)
    long = alias_bound(1.0, 100.0, interval_s=0.005, window_s=WINDOW_s, samples=20_000)
    assert long > 0.9 * short
