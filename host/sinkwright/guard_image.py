"""The guard's part of the board image: bands, hard limits and bounds, from what the tolerances of the parts allow.

Decides how wide a band is: so wide that no board whose parts keep their tolerances trips it, and no wider. Every sum is
the worst case, all tolerances against us. The firmware's guard.py, leads.py, cooling.py and scaling.py apply the
numbers. Knows no link and no device.
"""

from __future__ import annotations

import math
from typing import Any

from . import thermistor
from .definitions.board import BoardFile, ForceSense, VoltageSense

#: Control steps from one reading of the heatsink to the next: the length of the schedule in the firmware's control.py.
HEATSINK_STEPS = 66
#: What the firmware's guard allows above the limits of current and power, as a share.
_SLACK = 1 / 16
#: An amplifier ends below its rail (from memory: rail-to-rail output stages at light load); beyond, a reading is no
#: reading.
_RAIL_GAP_V = 0.03
_NOISE_DEVIATIONS = 4
_ROOM_K = 20.0
_HARD_HEATSINK_K = 5.0
#: Of the power, beside the tolerances that the cooling itself has: current and voltage are read to about 2 %.
_POWER_SHARE = 0.03
#: Thermistor and divider, gradients in the sink, and weather: common practice, no source.
_MISFIT_K = 6.0
_AIR_DRIFT_K_PER_H = 10.0
_PART_BITS, _LEAST_SHIFT = 13, 15


def guard_image(board: BoardFile) -> dict[str, Any]:
    """Keys of the image: `hard_counts`, `calibration`, `sense` and `cooling`; plain integers."""
    return {
        "hard_counts": _hard_counts(board),
        "calibration": _calibration(board),
        "sense": _sense(board),
        "cooling": _cooling(board),
    }


def gain_and_zero(board: BoardFile, name: str) -> tuple[float, float]:
    """How far a scale may lie from its nominal line: as a share of the gain, and in volts at the converter."""
    adc = board.adc
    adc_share = adc.gain_tolerance_percent / 100 + adc.gain_drift_ppm_per_K * 1e-6 * _ROOM_K
    adc_V = adc.offset_counts * adc.count_V
    if name == "current":
        sense = board.current_sense
        warm_K = _ROOM_K + sense.resistance_thermal_K_per_W * board.limits.current_A**2 * sense.resistance_ohm
        share = (sense.resistance_tolerance_percent + sense.amplifier_gain_tolerance_percent) / 100
        share += sense.resistance_drift_ppm_per_K * 1e-6 * warm_K
        zero_V = sense.pedestal_V * sense.pedestal_tolerance_percent / 100
        return share + adc_share, zero_V + sense.amplifier_offset_V * sense.amplifier_gain + adc_V
    divider = _divider(board, name)
    share = divider.ratio_tolerance_percent / 100
    if isinstance(divider, VoltageSense):
        share += divider.ratio_drift_ppm_per_K * 1e-6 * _ROOM_K
    zero_V = divider.pedestal_V * divider.pedestal_tolerance_percent / 100 + divider.offset_V
    return share + adc_share, zero_V + adc_V


def _divider(board: BoardFile, name: str) -> VoltageSense | ForceSense:
    return board.voltage_sense if name == "voltage" else board.force_sense


def _hard_counts(board: BoardFile) -> dict[str, int]:
    """Where a reading trips whatever any scale says: just above what a healthy board can show at its limit."""
    limits, sense = board.limits, board.current_sense
    trip_A = limits.current_A * (1 + _SLACK) + board.demand_margin_A
    return {
        "current": _highest(
            board, "current", sense.pedestal_V, trip_A * sense.V_per_A, limits.current_A * sense.V_per_A
        ),
        **{name: _highest_voltage(board, name) for name in ("voltage", "force")},
        "heatsink": _heatsink_counts(board),
    }


def _highest_voltage(board: BoardFile, name: str) -> int:
    divider = _divider(board, name)
    limit_V = board.limits.voltage_V / divider.ratio
    return _highest(board, name, divider.pedestal_V, limit_V, limit_V)


def _highest(board: BoardFile, name: str, pedestal_V: float, trip_V: float, limit_V: float) -> int:
    """Counts at `trip_V` above the pedestal in the worst case, unless the converter or its amplifier ends before."""
    share, zero_V = gain_and_zero(board, name)
    saturated_V = min(board.adc.range_V, board.adc.supply_V) - _RAIL_GAP_V
    worst_V = (pedestal_V + trip_V) * (1 + share) + zero_V
    least_V = (pedestal_V + limit_V) * (1 + share) + zero_V
    noise = _NOISE_DEVIATIONS * board.adc.noise_counts
    return min(math.ceil(max(min(worst_V, saturated_V), least_V) / board.adc.count_V + noise), 32766)


def _heatsink_counts(board: BoardFile) -> int:
    ntc = board.thermistor.heatsink
    hot_degC = board.limits.heatsink_degC + _HARD_HEATSINK_K
    ohm = thermistor.resistance_ohm(hot_degC, r25_ohm=ntc.r25_ohm, curve=ntc.curve, beta_K=ntc.beta_K)
    return math.floor(ntc.supply_V / board.adc.count_V * thermistor.divider_share(ohm, ntc.pullup_ohm))


def _calibration(board: BoardFile) -> dict[str, dict[str, int]]:
    """How far a stored calibration may move a line; beyond that, something else than a tolerance is wrong."""
    bounds = {}
    for name in ("current", "voltage", "force"):
        share, zero_V = gain_and_zero(board, name)
        bounds[name] = {
            "gain_ppm": math.ceil(share * 1e6),
            "zero_counts": math.ceil(zero_V / board.adc.count_V) + 1,
        }
    return bounds


def _sense(board: BoardFile) -> dict[str, int]:
    """The band of voltage minus force voltage: a constant, a share of the voltage, and what the leads drop.

    One converter reads both, so that its gain moves them together.
    """
    adc = board.adc
    fixed_V, share = 0.0, 0.0
    for name in ("voltage", "force"):
        divider = _divider(board, name)
        zero_V = divider.pedestal_V * divider.pedestal_tolerance_percent / 100 + divider.offset_V
        counts = adc.offset_counts + _NOISE_DEVIATIONS * adc.noise_counts + 1
        fixed_V += (zero_V + counts * adc.count_V) * divider.ratio
        share += divider.ratio_tolerance_percent / 100
    share += board.voltage_sense.ratio_drift_ppm_per_K * 1e-6 * _ROOM_K
    return {
        "fixed_uV": math.ceil(fixed_V * 1e6),
        "share_x1024": math.ceil(share * 1024),
        "lead_mohm": math.ceil(board.protection.lead_allowance_ohm * 1000),
        "short_mohm": math.ceil(_short_ohm(board) * 1000),
    }


def _short_ohm(board: BoardFile) -> float:
    """What lies across a source that limits: leads, sense resistor, and a hot transistor, fully on.

    Twice its resistance when cold: from memory, of silicon at 150 degC.
    """
    inner_ohm = 2 * board.transistor.on_resistance_ohm + board.current_sense.resistance_ohm
    return board.protection.lead_allowance_ohm + inner_ohm


def _cooling(board: BoardFile) -> dict[str, Any]:
    """Thermal resistances and time shares that bound every healthy heatsink; see the firmware's cooling.py."""
    sink = board.heatsink
    step_s = HEATSINK_STEPS * board.control.period_s
    capacity = 1 + sink.time_constant_tolerance_percent / 100
    weak = (1 + sink.K_per_W_tolerance_percent / 100) * (1 + _POWER_SHARE)
    J_per_K = sink.time_constant_s / sink.K_per_W
    large, small = J_per_K * capacity, J_per_K / capacity

    def stage(K_per_W: float, warm_J_per_K: float, cool_J_per_K: float) -> dict[str, Any]:
        return {
            "r_mK_per_W": max(1, round(K_per_W * 1000)),
            "warm": share_of(step_s / (K_per_W * warm_J_per_K)),
            "cool": share_of(step_s / (K_per_W * cool_J_per_K)),
        }

    still_K_per_W = sink.still_K_per_W if board.pins.fan is not None else sink.K_per_W
    return {
        "most": stage(sink.K_per_W * weak, small, large),
        "still": stage(still_K_per_W * weak, small, large),
        "least": stage(sink.K_per_W / weak, large, small),
        "drift_uK": math.ceil(_AIR_DRIFT_K_PER_H / 3600 * step_s * 1e6),
        "allowance_mK": round(_MISFIT_K * 1000),
        "coldest_mC": round(sink.coldest_air_degC * 1000),
    }


def share_of(exponent: float) -> list[int]:
    """1 - exp(-exponent) as [part, shift], for part / 2**(15 + shift) with part below 2**13; at most a quarter."""
    share = -math.expm1(-exponent)
    shift = max(0, -_LEAST_SHIFT + _PART_BITS - math.frexp(share)[1])
    part = round(share * 2 ** (_LEAST_SHIFT + shift))
    return [min(part, (1 << _PART_BITS) - 1), shift]
