"""Charge from a mean current: offsets and gains count for the whole time."""

from __future__ import annotations

import math

import pytest

from sinkwright.uncertainty.causes import Cause, Uncertain, expand
from sinkwright.uncertainty.charge import integrated_charge

OFFSET = Cause("offset", "rectangular", 0.0005)
GAIN = Cause("gain", "rectangular", 0.002)
mAh = 3.6


def drawn(duration_s: float) -> Uncertain:
    return integrated_charge(Uncertain(0.5, {OFFSET: 1.0, GAIN: 0.5}), duration_s, 50)


def test_half_an_ampere_for_five_hours() -> None:
    """Limits 0.5 mA, 0.2 %, 50 ppm: +-2.5, 5.0 and 0.125 mAh, u = 3.23 mAh (calculated)."""
    charge = drawn(5 * 3600)
    assert charge.value / mAh == pytest.approx(2500)
    limits = sorted(abs(s) * c.spread / mAh for c, s in charge.parts.items())
    assert limits == pytest.approx([0.125, 2.5, 5.0])
    assert charge.standard / mAh == pytest.approx(3.23, abs=0.005)


def test_more_hours_do_not_make_a_charge_relatively_better() -> None:
    for hours in (1, 10, 1000):
        charge = drawn(hours * 3600)
        assert charge.standard / charge.value == pytest.approx(math.hypot(0.001, 0.002, 5e-5) / math.sqrt(3))


def test_two_charges_by_one_meter_err_together() -> None:
    """A capacity fade is a difference of two charges: the gain's error of each is the same."""
    fade = drawn(5 * 3600) - drawn(4.5 * 3600)
    assert expand(fade).half_width < expand(drawn(5 * 3600)).half_width / 5
