"""Counts to readings and currents to codes, in the firmware's own integers."""

from __future__ import annotations

from tests.firmware.running import on_board

LARGEST_SMALL_INTEGER = 2**30


def test_a_scale_agrees_with_its_straight_line_to_half_a_unit_and_stays_a_small_integer() -> None:
    found = on_board("""
        from scaling import Scale
        scale = Scale({"zero_counts": 800, "whole": 1375, "part": 4321})
        found = [scale.reading(counts) for counts in range(-32768, 32768, 97)]
    """)
    for counts, reading in zip(range(-32768, 32768, 97), found, strict=True):
        n = counts - 800
        assert abs(reading - n * (1375 + 4321 / 2**14)) <= 0.5
        assert abs(n * 4321) < LARGEST_SMALL_INTEGER


def test_a_demand_becomes_the_nearest_code_and_never_leaves_the_converter() -> None:
    found = on_board("""
        from scaling import Demand
        demand = Demand(IMAGE["dac"])
        found = [demand.code(current_uA) for current_uA in (-10**9, -50_000, 0, 1_000_000, 4_000_000, 10**9)]
    """)
    uA_per_code = 82500 / 64
    expected = [
        0,
        round(124 - 50_000 / uA_per_code),
        124,
        *(round(124 + a / uA_per_code) for a in (1e6, 4e6)),
        4095,
    ]
    assert found == expected


def test_a_thermistor_reads_its_table_and_stops_at_the_ends() -> None:
    found = on_board("""
        from scaling import Thermistor
        thermistor = Thermistor(IMAGE["thermistor"])
        found = [thermistor.reading(counts) for counts in (0, 1000, 2500, 4000, 13200, 16600, 25000, 32767)]
    """)
    assert found == [125000, 125000, 102500, 80000, 25000, 12500, -20000, -20000]
