"""Constant current, power, resistance and voltage on sources whose answers are known in closed form.

The shipped firmware runs against the simulated board's physics (conversion latency, amplifier rails, on-resistance,
one count of noise) in a single MicroPython process without a host. Oracle: the load line of a Thevenin source,
solved here (reference sheet, section 2: V = (Voc +- sqrt(Voc^2 - 4*Rs*P))/2, I = Voc/(R + Rs), I = (Voc - V)/Rs).

A sampled loop needs a source that has settled before it looks again, so the grid keeps Rs*C below a millisecond.
"""

from __future__ import annotations

import itertools
import json
import math
from pathlib import Path
from typing import Any

import pytest

from sinkwright.board_image import compile_board
from sinkwright.definitions.loading import load_board
from tests.host.simulator.board_side import BOARD_SIDE
from tests.support.micropython import run_micropython

HERE = Path(__file__).parent
NOMINAL = HERE.parent / "host" / "simulator"
#: Of the shipped board: one count of the voltage, one code of the current.
COUNT_V = 1.375e-3
CODE_A = 1.289e-3
#: Less than this cannot be measured on the transistor's on-resistance, sense resistor included.
FLOOR_OHM = 0.09
BOARD_A, BOARD_W = 3.9, 38.0

Case = dict[str, Any]


def supply(voltage_V: float, resistance_ohm: float, **more: Any) -> Case:
    return {"kind": "supply", "voltage_V": voltage_V, "resistance_ohm": resistance_ohm, **more}


def current_at(mode: str, value: float, open_V: float, ohm: float) -> float:
    """The load line's solution on the stable branch."""
    if mode == "power":
        return (open_V - math.sqrt(open_V**2 - 4 * ohm * value)) / (2 * ohm)
    if mode == "resistance":
        return open_V / (value + ohm)
    return (open_V - value) / ohm


def values(mode: str, open_V: float, ohm: float) -> list[float]:
    """Set-points that span what a source of this kind offers."""
    if mode == "power":
        return [share * open_V**2 / (4 * ohm) for share in (0.1, 0.5, 0.95)]
    if mode == "resistance":
        return [ratio * ohm for ratio in (0.1, 0.4, 1.0, 30.0)]
    return [share * open_V for share in (0.3, 0.9)]


def grid() -> list[Case]:
    cases: list[Case] = []
    dynamics = itertools.cycle(
        (
            {},
            {"inductance_H": 1e-5},
            {"capacitance_F": 470e-6},
            {"leads_ohm": 0.05, "leads_inductance_H": 1e-6},
        )
    )
    for open_V, ohm, mode in itertools.product(
        (1.2, 3.7, 12.0, 28.0), (0.02, 0.05, 0.1, 0.25, 0.5, 1.5, 4.0), ("power", "resistance", "voltage")
    ):
        for value in values(mode, open_V, ohm):
            more = next(dynamics)
            if more.get("capacitance_F", 0) * ohm > 1e-3:
                more = {}
            current_A = current_at(mode, value, open_V, ohm)
            voltage_V = open_V - current_A * ohm
            floor_V = current_A * (FLOOR_OHM + more.get("leads_ohm", 0.0))
            if (
                0.05 < current_A < BOARD_A
                and voltage_V * current_A < BOARD_W
                and voltage_V > max(floor_V, 0.1)
            ):
                source = supply(open_V, ohm, **more)
                cases.append({"source": source, "mode": mode, "value": value, "settle_s": 0.6})
    return cases


def resolution(case: Case, found: Case) -> float:
    """What two counts of the voltage and one code of the current make of the held quantity."""
    if case["mode"] == "power":
        return found["voltage_V"] * CODE_A + 2 * found["current_A"] * COUNT_V
    if case["mode"] == "resistance":
        return 2 * COUNT_V + case["value"] * CODE_A
    return 2 * COUNT_V + case["source"]["resistance_ohm"] * CODE_A


def missed_by(case: Case, found: Case) -> float:
    if case["mode"] == "power":
        return found["voltage_V"] * found["current_A"] - case["value"]
    if case["mode"] == "resistance":
        return found["voltage_V"] - case["value"] * found["current_A"]
    return found["voltage_V"] - case["value"]


ENDS = (
    ("current", 3.0),
    ("current", 0.2),
    ("power", 25.0),
    ("power", 5.0),
    ("resistance", 4.0),
    ("resistance", 30.0),
    ("voltage", 10.6),
    ("voltage", 11.7),
)
CHANGES = [
    {"source": supply(12.0, 0.5), "mode": a[0], "value": a[1], "then": b, "settle_s": 0.5}
    for a, b in itertools.permutations(ENDS, 2)
    if a[0] != b[0]
]

#: Away for at least five control periods: until then the amplifiers are wound up, whatever firmware does.
CLAMPED_WITHIN_s = 5 * 2.35e-3
RETURNS = [
    {
        "source": supply(12.0, 0.045),
        "mode": mode,
        "value": value,
        "settle_s": 1.2,
        "defects": [
            {"kind": "source_disconnected", "from_us": from_us, "until_us": from_us + int(away_s * 1e6)}
        ],
        # From 1.7 s, when it has settled, until a moment after its return.
        "away_s": 0.115 + away_s,
    }
    for mode, value in (("current", 1.0), ("power", 11.955), ("resistance", 11.955), ("voltage", 11.955))
    for away_s in (CLAMPED_WITHIN_s, 0.05, 1.0)
    for from_us in (1_800_000, 1_800_800, 1_801_600, 1_803_700)
]

LIMITED = (
    {"limit_A": 1.0},
    {"limit_A": 1.0, "capacitance_F": 470e-6},
    {"limit_A": 2.5, "limit_kind": "foldback", "foldback_A": 0.8},
    {"limit_A": 2.5, "limit_kind": "foldback", "foldback_A": 0.8, "capacitance_F": 1e-3},
)
UNSETTLED = [
    {"source": supply(12.0, 0.045, **limit), "mode": mode, "value": value, "settle_s": 3.0, "watch_s": 2.0}
    for limit in LIMITED
    for mode, value in (("voltage", 8.0), ("resistance", 3.0))
]
LIMITED_POWER = [
    {"source": supply(12.0, 0.045, **limit), "mode": "power", "value": 35.0, "settle_s": 2.0, "watch_s": 2.0}
    for limit in LIMITED
]
TOO_MUCH_POWER = [
    {
        "source": supply(open_V, ohm),
        "mode": "power",
        "value": share * open_V**2 / (4 * ohm),
        "settle_s": 1.5,
        "watch_s": 1.0,
    }
    for open_V, ohm, share in (
        (12.0, 4.0, 1.05),
        (12.0, 4.0, 3.0),
        (3.7, 0.9, 1.05),
        (3.7, 0.9, 8.0),
        (24.0, 15.0, 1.3),
    )
]
CURVES = [
    {"source": {"kind": "curve", "points": points}, "mode": mode, "value": value, "settle_s": 1.5}
    for points, mode, value in (
        ([[0.0, 0.76], [0.45, 0.69], [0.57, 0.0]], "voltage", 0.5),
        ([[0.0, 0.76], [0.45, 0.69], [0.57, 0.0]], "power", 0.28),
        ([[0.0, 1.9], [15.0, 1.8], [18.0, 1.5], [20.0, 0.8], [21.6, 0.0]], "voltage", 17.0),
        ([[0.0, 1.9], [15.0, 1.8], [18.0, 1.5], [20.0, 0.8], [21.6, 0.0]], "power", 26.0),
        ([[0.0, 1.9], [15.0, 1.8], [18.0, 1.5], [20.0, 0.8], [21.6, 0.0]], "resistance", 15.0),
    )
]
#: One code of the current is too coarse for these: 1.3 mA of 9 mA, and 19 mV of 0.2 V.
TOO_FINE = [
    {"source": supply(12.0, 0.5), "mode": "resistance", "value": 1400.0, "settle_s": 0.6},
    {"source": supply(12.0, 0.5), "mode": "power", "value": 0.1, "settle_s": 0.6},
    {"source": supply(1.2, 15.0), "mode": "voltage", "value": 0.2, "settle_s": 1.0},
]
ABOVE_OPEN = [
    {
        "source": supply(12.0, 0.5),
        "mode": "voltage",
        "value": 14.0,
        "settle_s": 1.0,
        "then": ("voltage", 11.0),
    }
]
BEYOND_THE_LOAD = [
    {"source": supply(12.0, 0.1), "mode": "resistance", "value": 1.0, "settle_s": 0.6},
    {"source": supply(12.0, 1.0), "mode": "voltage", "value": 4.0, "settle_s": 0.6},
]

SETS = {
    "grid": grid(),
    "changes": CHANGES,
    "returns": RETURNS,
    "unsettled": UNSETTLED,
    "limited power": LIMITED_POWER,
    "too much power": TOO_MUCH_POWER,
    "curves": CURVES,
    "too fine": TOO_FINE,
    "above open": ABOVE_OPEN,
    "beyond the load": BEYOND_THE_LOAD,
}


@pytest.fixture(scope="module")
def findings() -> dict[str, list[tuple[Case, Case]]]:
    """Every case with what came of it, by the name of its set."""
    cases = [case for cases in SETS.values() for case in cases]
    lines = f"{json.dumps(compile_board(load_board(None)))}\n{json.dumps(cases)}\n"
    printed = run_micropython(
        "import carrying_out\ncarrying_out.main()\n",
        extra_path=(BOARD_SIDE, NOMINAL, HERE / "modes"),
        stdin=lines.encode(),
        heapsize="16m",
        timeout_s=300.0,
    )
    found = iter(json.loads(printed.splitlines()[-1]))
    return {name: [(case, next(found)) for case in cases] for name, cases in SETS.items()}


def told(case: Case, found: Case) -> str:
    return f"{case} found {found}"


def test_every_mode_converges_to_the_closed_form_within_the_set_resolution(findings):
    assert len(findings["grid"]) > 90
    for case, found in findings["grid"]:
        assert abs(missed_by(case, found)) <= resolution(case, found), told(case, found)
        assert (found["limiting"], found["fault"]) == ("none", 0), told(case, found)


def test_constant_power_keeps_to_the_branch_where_the_power_rises_with_the_current(findings):
    for case, found in findings["grid"]:
        if case["mode"] == "power":
            assert found["voltage_V"] > case["source"]["voltage_V"] / 2, told(case, found)


def test_no_mode_passes_its_own_end_on_the_way_there(findings):
    for case, found in findings["grid"]:
        source = case["source"]
        end_A = current_at(case["mode"], case["value"], source["voltage_V"], source["resistance_ohm"])
        noise_A = 2 * COUNT_V / source["resistance_ohm"] if case["mode"] == "voltage" else 0.0
        assert found["peak_A"] <= 1.02 * end_A + 4 * CODE_A + noise_A, told(case, found)


def test_a_mode_changed_under_load_never_passes_above_both_ends(findings):
    for case, found in findings["changes"]:
        higher_A = max(found["first_A"], found["current_A"])
        assert found["peak_A"] <= higher_A + 4 * CODE_A, told(case, found)
        assert found["fault"] == 0, told(case, found)


def test_a_source_that_returns_is_loaded_by_a_ramp_and_not_by_wound_up_amplifiers(findings):
    """Without clamping it is 44 A (reference sheet, section 1). The bound: 2 % above what flowed before it left."""
    for case, found in findings["returns"]:
        # Gone for so short a time, it may as well have given way.
        assert found["away_clamped"] and found["away_limiting"] in ("no source", "source"), told(case, found)
        assert found["peak_A"] <= 1.02 * found["first_peak_A"], told(case, found)
        assert found["current_A"] == pytest.approx(found["first_A"], abs=0.02), told(case, found)
        assert (found["limiting"], found["fault"]) == ("none", 0), told(case, found)


def test_more_power_than_a_source_can_give_is_unreachable_and_does_not_collapse_it(findings):
    for case, found in findings["too much power"]:
        source = case["source"]
        most_W = source["voltage_V"] ** 2 / (4 * source["resistance_ohm"])
        assert found["limiting"] == "unreachable", told(case, found)
        assert found["lowest_V"] > 0.5 * source["voltage_V"], told(case, found)
        assert found["voltage_V"] * found["current_A"] > 0.95 * most_W, told(case, found)


def test_more_power_than_a_current_limit_allows_leaves_the_source_in_regulation(findings):
    for case, found in findings["limited power"]:
        assert (found["limiting"], found["fault"]) == ("unreachable", 0), told(case, found)
        assert found["lowest_V"] > 11.5, told(case, found)


def test_into_a_hard_limit_voltage_and_resistance_report_unsettled_and_stand_still(findings):
    for case, found in findings["unsettled"]:
        assert (found["limiting"], found["fault"]) == ("unsettled", 0), told(case, found)
        assert found["highest_V"] - found["lowest_V"] < 0.1, told(case, found)


def test_a_solar_curve_is_held_on_both_sides_of_its_maximum(findings):
    for case, found in findings["curves"]:
        assert found["limiting"] == "none", told(case, found)
        assert abs(missed_by(case, found)) < 0.01 * case["value"] + 2 * COUNT_V, told(case, found)


def test_what_is_finer_than_the_converters_is_reported_as_unresolved(findings):
    for case, found in findings["too fine"]:
        assert found["limiting"] == "unresolved", told(case, found)


def test_a_voltage_above_the_open_one_draws_nothing_and_leaves_nothing_wound_up(findings):
    ((case, found),) = findings["above open"]
    assert found["first_limiting"] == "source"
    assert abs(found["first_A"]) < CODE_A
    # Asked for 11 V next: 2 A, and no overshoot from what was wanted in vain before.
    assert found["voltage_V"] == pytest.approx(11.0, abs=2 * COUNT_V)
    assert found["peak_A"] < 2.02, told(case, found)


def test_a_set_point_beyond_the_loads_own_limits_ends_at_them_without_a_fault(findings):
    for case, found in findings["beyond the load"]:
        assert (found["limiting"], found["fault"]) == ("saturated", 0), told(case, found)
        power_W = found["voltage_V"] * found["current_A"]
        assert found["current_A"] == pytest.approx(4.0, abs=0.01) or power_W == pytest.approx(40.0, abs=0.2)
