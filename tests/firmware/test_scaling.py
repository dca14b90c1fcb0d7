"""Counts to readings and currents to codes, in the firmware's own integers."""

from __future__ import annotations

import csv
import json
from pathlib import Path
from typing import Any

import pytest

from sinkwright.board_image import compile_board
from sinkwright.definitions.loading import load_board
from tests.firmware.running import on_board

LARGEST_SMALL_INTEGER = 2**30
NTC = Path(__file__).parent.parent / "data" / "ntc_10k_3977.csv"


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


@pytest.mark.parametrize("supply_V", [3.3 * 0.998, 3.3, 3.3 * 1.002])
def test_the_shipped_thermistor_reads_within_half_a_kelvin_of_its_datasheet(supply_V: float) -> None:
    """NTCLE100E3 (Vishay doc 29049) under 10 kohm, by the shipped image; its supply within the reference's 0.2 %."""
    rows = [
        (float(row["t_degC"]), float(row["r_ohm"]))
        for row in csv.DictReader(NTC.read_text(encoding="utf-8").splitlines()[1:])
        if -20 <= float(row["t_degC"]) <= 125
    ]
    counts = [round(supply_V * ohm / (ohm + 10_000) / 4.096 * 32768) for _, ohm in rows]
    found = on_board(f"""
        from scaling import Thermistor
        thermistor = Thermistor({json.dumps(compile_board(load_board())["thermistor"])})
        found = [thermistor.reading(counts) for counts in {counts}]
    """)
    assert len(rows) >= 30
    assert [mC / 1000 for mC in found] == [pytest.approx(degC, abs=0.5) for degC, _ in rows]


def test_a_calibrated_scale_keeps_both_lines() -> None:
    found = on_board("""
        from scaling import Scale
        scale = Scale({"zero_counts": 800, "whole": 1375, "part": 0})
        before = [scale.calibrated, scale.reading(10_000), scale.nominal(10_000)]
        scale.calibrate({"zero_counts": 790, "whole": 1380, "part": 8192, "offset": -500})
        found = [before, scale.calibrated, scale.reading(10_000), scale.nominal(10_000),
                 scale.higher(10_000), scale.lower(10_000)]
    """)
    nominal = 9200 * 1375
    calibrated = round(9210 * 1380.5 - 500)
    assert found == [[False, nominal, nominal], True, calibrated, nominal, calibrated, nominal]


def test_the_counts_of_a_limit_are_the_last_that_neither_line_reads_beyond_it() -> None:
    found = on_board("""
        from scaling import Scale
        scale = Scale({"zero_counts": 800, "whole": 1375, "part": 0})
        scale.calibrate({"zero_counts": 800, "whole": 1400, "part": 0, "offset": 0})
        high = scale.highest_counts(30_000_000)
        low = scale.lowest_counts(-300_000)
        found = [high, scale.higher(high) <= 30_000_000 < scale.higher(high + 1),
                 low, scale.lower(low) >= -300_000 > scale.lower(low - 1), scale.highest_counts(2**29)]
    """)
    assert found == [800 + 30_000_000 // 1400, True, 800 - 300_000 // 1400, True, 32767]


CHANGES = {
    "a gain beyond the parts": ('calibration["voltage"]["whole"] = 1390', "gain of voltage"),
    "a gain below them": ('calibration["current"]["whole"] = 195', "gain of current"),
    "a zero beyond them": ('calibration["force"]["zero_counts"] = 1000', "zero of force"),
    "a zero beyond them by its offset": (
        'calibration["voltage"]["zero_counts"] = 860; calibration["voltage"]["offset"] = -1370',
        "zero of voltage",
    ),
    "an offset of more than a count": ('calibration["current"]["offset"] = 300', "offset of current"),
    "a gain that is not split": ('calibration["voltage"]["part"] = 1 << 14', "written as it must be"),
    "a missing coefficient": ('del calibration["voltage"]["part"]', "voltage lacks"),
    "a missing scale": ('del calibration["current"]', "current lacks"),
    "a text for a number": ('calibration["voltage"]["whole"] = "1375"', "voltage lacks"),
}
_NOMINAL = """
        from scaling import implausible
        calibration = {"number": 1}
        for name in IMAGE["scales"]:
            calibration[name] = dict(IMAGE["scales"][name], offset=0)
"""


@pytest.mark.parametrize("name", CHANGES)
def test_a_calibration_that_parts_within_tolerance_cannot_need_is_told_in_words(name: str) -> None:
    change, words = CHANGES[name]
    found: Any = on_board(f"""{_NOMINAL}
        {change}
        found = implausible(calibration, IMAGE)
    """)
    assert words in found


def test_the_ends_of_the_tolerances_are_plausible() -> None:
    found = on_board(f"""{_NOMINAL}
        found = [implausible(calibration, IMAGE)]
        for name in IMAGE["scales"]:
            bounds = IMAGE["calibration"][name]
            entry = IMAGE["scales"][name]
            for sign in (-1, 1):
                gain = (entry["whole"] << 14) * (1_000_000 + sign * (bounds["gain_ppm"] - 1)) // 1_000_000
                zero = entry["zero_counts"] + sign * bounds["zero_counts"]
                calibration[name] = {{"zero_counts": zero, "whole": gain >> 14, "part": gain & 16383, "offset": 0}}
                found.append(implausible(calibration, IMAGE))
    """)
    assert found == [""] * 7
