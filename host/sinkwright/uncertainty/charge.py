"""Charge from a mean current and a time: what errs in the mean errs in every second alike.

An offset and a gain are the same from sample to sample, so the charge errs by them times the whole duration;
dividing by the square root of the number of samples would be wrong.
"""

from __future__ import annotations

from sinkwright.uncertainty.causes import Cause, Uncertain


def integrated_charge(mean_current: Uncertain, duration_s: float, clock_ppm: float) -> Uncertain:
    """Charge in coulomb of a mean current in A over `duration_s`, by a clock within +-`clock_ppm`.

    The charge of a current I that errs by dI, over T that errs by dT: Q = I*T, dQ = dI*T + I*dT.
    """
    clock = Cause("the board's clock", "rectangular", clock_ppm * 1e-6)
    return mean_current * Uncertain(duration_s, {clock: duration_s})
