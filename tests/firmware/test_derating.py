"""The power that is left as the load gets hot, and that the control step takes no more."""

from __future__ import annotations

import pytest

from tests.firmware.running import on_32_bit_board, on_board
from tests.firmware.sink import SINK

LIMITS = """
        from derating import Derating
        from limits import Limits
        def made(heatsink_mC=85_000, junction_mC=125_000, power_uW=40_000_000, rise_mK_per_W=1000):
            derating = Derating([{"r_mK_per_W": rise_mK_per_W}])
            limits = dict(IMAGE["limits"])
            limits["heatsink_mC"] = heatsink_mC
            limits["junction_mC"] = junction_mC
            limits["power_uW"] = power_uW
            derating.apply(Limits(limits))
            return derating
"""
#: Jumps of the heatsink's temperature are no fault here.
PATIENT = "cooling=dict(IMAGE['cooling'], allowance_mK=200_000)"


def test_the_power_falls_linearly_over_the_last_ten_kelvin() -> None:
    found = on_board(f"""{LIMITS}
        derating = made(junction_mC=175_000)
        found = []
        for heatsink_mC in (-40_000, 74_999, 75_000, 77_500, 80_000, 84_000, 85_000, 150_000):
            derating.step(heatsink_mC)
            found.append([derating.power_mW, derating.active])
    """)
    exact = [40_000, 40_000, 40_000, 30_000, 20_000, 4_000, 0, 0]
    assert [power_mW for power_mW, _ in found] == [
        pytest.approx(power_mW, abs=32) for power_mW in exact
    ]  # 8 mK
    assert [active for _, active in found] == [False] * 3 + [True] * 5


@pytest.mark.parametrize(("heatsink_degC", "power_W"), [(75, 40.0), (80, 36.0), (100, 20.0), (125, 0.0)])
def test_the_junctions_cap_is_where_its_own_line_meets_its_rise(heatsink_degC: int, power_W: float) -> None:
    """P = 40 W * (125 - Tj) / 10 K with Tj = heatsink + 1 K/W * P, solved by hand: P = (125 - heatsink) / 1.25 K/W."""
    found = on_board(f"""{LIMITS}
        derating = made(heatsink_mC=150_000)
        derating.step({heatsink_degC}_000)
        found = derating.power_mW
    """)
    assert found == pytest.approx(power_W * 1000, abs=1)
    if power_W < 40:
        assert found / 1000 == pytest.approx(40 * (125 - heatsink_degC - found / 1000) / 10, abs=0.01)


def test_a_sink_that_is_too_weak_comes_to_rest_without_oscillation_or_trip() -> None:
    """Four times the shipped resistance: 24 degC + 4 K/W * P = 85 degC - P / 4 W/K gives 14.35 W at 81.4 degC."""
    found = on_board(f"""{SINK}{LIMITS}
        derating = made()
        sink = Sink(resistance=4.0, still=1.0)
        powers = []
        hottest = 0
        for step in range(50_000):
            derating.step(sink.step(derating.power_mW / 1000))
            hottest = max(hottest, sink.air + sink.rise)
            powers.append(derating.power_mW)
        tail = powers[-3000:]
        rises = sum([1 for before, after in zip(powers, powers[1:]) if after > before + 40])
        found = [min(tail), max(tail), hottest, rises]
    """)
    least, most, hottest, rises = found
    assert most - least <= 40  # the thermistor's millidegree is worth 4 mW here
    assert least == pytest.approx(61 / 4.25 * 1000, rel=0.01)
    assert hottest < 85
    assert rises == 0


def test_the_load_follows_the_cap_down_and_back_and_says_so() -> None:
    """3 A at 12 V are 36 W; at 80 degC half of 40 W is left."""
    found = on_board(f"""
        session = Session({PATIENT})
        session.sink(3_000_000)
        control = session.firmware.control
        guard = session.firmware.guard
        def at(heatsink_mC):
            session.board.show(None, 12_000_000, heatsink_mC)
            guard.quiet_steps = 0
            session.turns(300)
            return [control.demand_uA, control.limiting, guard.current_cap_uA]
        found = [at(60_000), at(80_000), at(84_900), at(60_000), guard.fault]
    """)
    cold, half, little, again, fault = found
    assert cold == again == [3_000_000, 0, 4_000_000]
    assert half == [
        pytest.approx(20.0 / 12.0 * 1e6, abs=5_000),
        3,
        pytest.approx(20.0 / 12.0 * 1e6, abs=5_000),
    ]
    assert little[0] == pytest.approx(0.4 / 12.0 * 1e6, abs=5_000)
    assert fault == 0


def test_a_narrower_limit_derates_earlier() -> None:
    found = on_board(f"""
        session = Session({PATIENT})
        session.sink(3_000_000)
        limits = [4_000_000, 30_000_000, 40_000_000, 60_000, 125_000, 400_000, 3_000]
        session.ask(wire.SET_LIMITS, struct.pack(wire.SET_LIMITS_FORMAT, *limits))
        session.board.show(None, 12_000_000, 55_000)
        session.turns(300)
        found = [session.firmware.control.demand_uA, session.firmware.control.limiting]
    """)
    assert found == [pytest.approx(20.0 / 12.0 * 1e6, abs=5_000), 3]


def test_every_product_stays_within_31_bits() -> None:
    """400 W, 20 K/W seven times over, any temperature of a table, and voltages from nothing to the meter's end."""
    found = on_32_bit_board(f"""{LIMITS}
        def small(call, first, second, third):
            micropython.heap_lock()
            try:
                call(first, second, third)
                return True
            except MemoryError:
                return False
            finally:
                micropython.heap_unlock()
        found = []
        for power_uW in (1, 40_000_000, 400_000_000):
            for rise in (1, 1000, 140_000):
                derating = made(120_000, 175_000, power_uW, rise)
                for heatsink_mC in (-40_000, 0, 109_999, 110_001, 119_999, 150_000):
                    found.append(small(lambda heatsink_mC, _, __: derating.step(heatsink_mC), heatsink_mC, 0, 0))
                    for voltage_uV in (-80_000_000, -1, 0, 999, 1000, 80_000_000):
                        for before_uA in (0, 16_000_000):
                            found.append(small(derating.smoothed_uA, before_uA, voltage_uV, 16_000_000))
    """)
    assert all(found) and len(found) == 9 * 6 * 13
