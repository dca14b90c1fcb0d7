"""The mode laws and the observed slope by themselves: against a load line, without converters or time.

Oracle: the load line of a Thevenin source (reference sheet, section 2) and exact arithmetic in CPython.
"""

from __future__ import annotations

import math
from typing import Any

import pytest

from tests.firmware.running import on_32_bit_board, on_board

FOLLOW = """
    from laws import Laws
    from slope import Slope

    class Guard:
        class limits:
            current_uA = 4_000_000
            power_uW = 40_000_000
        current_cap_uA = 4_000_000
        derated = False

    def follow(mode, setpoint, open_uV, mohm, moves, limit_uA=1 << 29):
        '''The pairs that a law sees on a source that may have a hard limit: (uV, uA, limiting, gave way).'''
        slope = Slope(1376, 5_000)
        laws = Laws(IMAGE, Guard, slope)
        laws.obey(mode)
        laws.ask(setpoint)
        slope.begin(open_uV)
        demand = 0
        seen = []
        for _ in range(moves):
            flows = min(demand, limit_uA)
            short = flows < demand - (demand >> 4) - 37_500
            volt = 1_000 if short else open_uV - flows * mohm // 1000
            slope.see(volt, flows)
            laws.see(volt, flows)
            demand = laws.next_uA(demand, short)
            seen.append([volt, flows, laws.limiting, laws.gave_way])
            if laws.gave_way:
                laws.gave_way = False
                demand = 0
                slope.begin(open_uV)
        return seen
"""
UNREACHABLE, UNSETTLED, NONE, SOURCE, SATURATED, UNRESOLVED = 6, 8, 0, 1, 5, 7
POWER, RESISTANCE, VOLTAGE = 2, 3, 4


def follow(
    mode: int, setpoint: int, open_V: float, ohm: float, moves: int = 80, limit_A: float | None = None
) -> list[Any]:
    limit = f", limit_uA={int(limit_A * 1e6)}" if limit_A is not None else ""
    call = f"{mode}, {setpoint}, {int(open_V * 1e6)}, {round(ohm * 1000)}, {moves}{limit}"
    return on_board(f"{FOLLOW}\n    found = follow({call})")


@pytest.mark.parametrize("ratio", [0.05, 0.4, 0.8, 1.0, 20.0])
def test_resistance_converges_on_either_side_of_the_sources_own(ratio: float) -> None:
    """By I = V/R alone it would diverge below a ratio of 1: the multiplier is -Rs/R."""
    seen = follow(RESISTANCE, round(ratio * 4000), 12.0, 4.0)
    expected_uA = 12e6 / (4.0 * ratio + 4.0)
    assert seen[-1][1] == pytest.approx(expected_uA, rel=2e-3)
    assert max(pair[1] for pair in seen) <= expected_uA * 1.005


@pytest.mark.parametrize("share", [0.02, 0.5, 0.9, 0.97])
def test_power_converges_to_the_branch_above_half_the_open_voltage(share: float) -> None:
    power_W = share * 12.0**2 / 16.0
    seen = follow(POWER, round(power_W * 1e6), 12.0, 4.0, 120)
    expected_V = (12.0 + math.sqrt(144.0 - 16.0 * power_W)) / 2
    assert seen[-1][0] == pytest.approx(expected_V * 1e6, rel=2e-3)
    assert min(pair[0] for pair in seen) > 6e6


@pytest.mark.parametrize("share", [1.01, 1.5, 4.4])
def test_more_power_than_there_is_ends_at_the_top_and_says_so(share: float) -> None:
    seen = follow(POWER, round(share * 9e6), 12.0, 4.0, 120)
    volt, flows, limiting, gave_way = seen[-1]
    assert (limiting, gave_way) == (UNREACHABLE, False)
    assert volt * flows / 1e12 > 0.98 * 9.0
    assert min(pair[0] for pair in seen) > 6e6


def test_voltage_converges_from_above_without_undershoot() -> None:
    seen = follow(VOLTAGE, 11_000_000, 12.0, 0.5)
    assert seen[-1][0] == pytest.approx(11e6, abs=1400)
    assert min(pair[0] for pair in seen) > 11e6 - 3_000


def test_voltage_above_the_open_one_asks_for_nothing() -> None:
    seen = follow(VOLTAGE, 13_000_000, 12.0, 0.5)
    assert {pair[1] for pair in seen} == {0}
    assert seen[-1][2] == SOURCE


@pytest.mark.parametrize(("mode", "setpoint"), [(VOLTAGE, 8_000_000), (RESISTANCE, 3_000)])
def test_a_source_that_gave_way_is_let_go_and_not_led_there_again(mode: int, setpoint: int) -> None:
    seen = follow(mode, setpoint, 12.0, 0.045, 120, limit_A=1.0)
    assert sum(pair[3] for pair in seen) == 1
    assert seen[-1][2] == UNSETTLED
    assert 0.5e6 < seen[-1][1] <= 1.0e6


def test_power_beyond_a_hard_limit_is_unreachable_after_giving_way_once() -> None:
    seen = follow(POWER, 30_000_000, 12.0, 0.045, 160, limit_A=1.0)
    assert sum(pair[3] for pair in seen) == 1
    assert seen[-1][2] == UNREACHABLE
    assert seen[-1][1] > 0.75e6


def test_the_loads_own_power_binds_every_law() -> None:
    volt, flows, limiting, _ = follow(RESISTANCE, 1_000, 14.0, 0.1)[-1]
    assert limiting == SATURATED
    assert volt * flows / 1e12 == pytest.approx(40.0, abs=0.1)


def test_less_than_sixteen_codes_is_unresolved() -> None:
    assert follow(RESISTANCE, 2_000_000, 12.0, 0.5)[-1][2] == UNRESOLVED


def test_a_slope_is_moved_only_as_far_as_the_converters_counts_allow() -> None:
    found = on_board("""
        from slope import Slope
        slope = Slope(1000, 5_000)
        slope.begin(12_000_000)
        found = [slope.known, slope.mohm]
        slope.see(11_999_000, 4_000)
        found.append(slope.known)
        # 0.5 A make 0.05 V: 100 mohm, and 6 mohm of doubt from three counts at either end.
        slope.see(11_950_000, 500_000)
        found += [slope.known, slope.mohm]
        # 50 mA and 4 mV: 20 to 140 mohm, which says nothing against 106.
        slope.see(11_946_000, 550_000)
        found.append(slope.mohm)
        # 0.5 A and 0.2 V: more than that.
        slope.see(11_746_000, 1_050_000)
        found.append(slope.mohm)
    """)
    assert found == [False, 1_000_000, False, True, 106, 106, 394]


@pytest.mark.parametrize("board", [on_board, on_32_bit_board])
def test_the_arithmetic_of_the_laws_is_exact_to_its_last_digits(board: Any) -> None:
    """Over the whole range, and on the 32-bit interpreter, where a wrong bound would make a big integer."""
    found = board("""
        import laws
        volts = [0, 1, 1375, 999_999, 1_048_575, 1_048_576, 12_345_678, 80_000_000]
        mohms = [1, 4, 45, 999, 12_345, 1_000_000, (1 << 26) - 1]
        shares = [(0, 1), (1, 3), (600, 4600), (10, 10_010), (1 << 26, (1 << 26) + 1_000_000)]
        found = {
            "current": [[v, r, laws.current(v, r)] for v in volts for r in mohms],
            "drawn": [[p, v, laws.drawn_by(p, v)] for p in (1, 999, 1_000_000, 40_000_000) for v in volts if v > 1000],
            "portion": [[i, a, b, laws.portion(i, a, b)] for i in (-16_000_000, -77, 0, 5, 4_000_000, 16_000_000)
                        for a, b in shares],
            "times": [[i, v, r, laws.times_up_to_8(i, v, r)] for i in (-4_000_000, 3, 1_000_000)
                      for v in volts if v > 99_999 for r in (v, v >> 1, v >> 4, -v)],
        }
    """)
    most = 16e6
    for volt, mohm, made in found["current"]:
        assert made == pytest.approx(min(volt * 1000 / mohm, most), rel=1e-4, abs=1)
    for power, volt, made in found["drawn"]:
        assert made == pytest.approx(min(power / (volt // 1000) * 1000, most), rel=1e-6, abs=1)
    for value, part, whole, made in found["portion"]:
        assert made == pytest.approx(value * part / whole, rel=1e-2, abs=2 + abs(value) / 16384)
    for value, volt, room, made in found["times"]:
        assert made == pytest.approx(value * volt / max(room, volt >> 3), rel=1e-2, abs=10)
