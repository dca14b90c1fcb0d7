"""Charge, energy, means and extremes in the firmware's own integers."""

from __future__ import annotations

from fractions import Fraction

import pytest
from hypothesis import given
from hypothesis import strategies as st

from tests.firmware.running import on_board


def test_power_is_the_product_within_two_microwatt_over_the_whole_range() -> None:
    found = on_board("""
        from meter import power_uW
        found = []
        for voltage_uV in range(-80_000_000, 80_000_001, 7_654_321):
            for current_uA in range(-12_000_000, 12_000_001, 1_234_567):
                power = power_uW(voltage_uV, current_uA)
                found.append([voltage_uV, current_uA, power])
    """)
    for voltage_uV, current_uA, power in found:
        assert abs(power - Fraction(voltage_uV * current_uA, 10**6)) <= 2
        assert abs(power) < 2**30


def test_after_a_year_at_full_current_one_microampere_step_still_counts() -> None:
    """No resolution is lost however long the run: the sum is exact, in integers that fit 31 bits."""
    found = on_board("""
        from meter import Meter
        meter = Meter(2350)
        year = 365 * 24 * 3600 * 1_000_000 // 2350 * 4_000_000
        meter.charge.high = year >> 26
        meter.charge.low = year & (1 << 26) - 1
        before = meter.charge.total()
        meter.charge.add(1)
        found = [meter.charge.total() - before, meter.charge.high < 1 << 30]
    """)
    assert found == [1, True]


def test_charge_and_energy_are_current_and_power_times_time() -> None:
    found = on_board("""
        session = Session()
        session.sink(1_500_000)
        meter = session.firmware.meter
        before = [session.firmware.time.now_us(), meter.charge_uC(), meter.energy_uJ()]
        for _ in range(400):
            session.firmware.guard.quiet_steps = 0
            session.turns(100)
        after = [session.firmware.time.now_us(), meter.charge_uC(), meter.energy_uJ()]
        found = [b - a for a, b in zip(before, after)]
    """)
    elapsed_s = found[0] / 1e6
    assert found[1] / 1e6 == pytest.approx(1.5 * elapsed_s, rel=2e-4)
    assert found[2] / 1e6 == pytest.approx(1.5 * 11.999625 * elapsed_s, rel=2e-4)


@given(st.lists(st.integers(-960_000_000, 960_000_000), min_size=1, max_size=40))
def test_limbs_sum_exactly_and_stay_small(amounts: list[int]) -> None:
    low = high = 0
    for amount in amounts:
        assert abs(low + amount) < 2**30
        total = low + amount
        high += total >> 26
        low = total & (2**26 - 1)
    assert (high << 26) + low == sum(amounts)


def test_the_boards_limbs_sum_exactly() -> None:
    found = on_board("""
        from meter import Limbs
        limbs = Limbs()
        expected = 0
        for amount in (960_000_000, -960_000_000, 1, -1, 12_000_000, 67_108_863, -67_108_864) * 50:
            limbs.add(amount)
            expected += amount
            if not 0 <= limbs.low < 1 << 26:
                expected = None
        found = [limbs.total(), expected]
    """)
    assert found[0] == found[1]


def test_a_spike_of_one_conversion_stands_in_the_windows_extremes() -> None:
    found = on_board("""
        session = Session()
        session.sink(1_000_000)
        window = session.firmware.meter.telemetry
        window.restart()
        session.turns(33)
        session.board.show(1_000_000, 13_000_000)
        session.turns(2)
        session.board.show(1_000_000, 12_000_000)
        session.turns(31)
        found = [window.voltage_min_uV, window.voltage_max_uV, window.pairs]
    """)
    assert found[0] == pytest.approx(12e6, abs=1375)
    assert found[1] == pytest.approx(13e6, abs=1375)
    assert found[2] == 32
