"""Draws the parts of one simulated board: what the tolerances of a board file allow, decided by a seed.

Every error is rectangular within its tolerance, as the error budget assumes of parts that were never
measured. Each part has its own generator, so that a part added later leaves the others as they were. The
result is the actual circuit in SI units, for `board_side`; nothing here knows firmware or time.
"""

from __future__ import annotations

from random import Random
from typing import Any

import msgspec

from sinkwright.definitions.board import BoardFile, ForceSense, Ntc, VoltageSense
from sinkwright.definitions.source import SourceFile
from sinkwright.thermistor import resistance_ohm

#: Air in the simulated room: near the 25 degC for which tolerances are stated, so that drifts with
#: temperature come from what heats itself.
AMBIENT_DEGC = 24.0

#: An output stage comes this close to its rail. From memory: rail-to-rail operational amplifiers at light
#: load.
_RAIL_GAP_V = 0.02

#: The current that a transistor would carry with the amplifier at its rail: square law of the gate's
#: overdrive, set so that 7 V of it give 44 A. Calculated with ngspice for 12 V behind 45 mohm, connected
#: while 1 A is asked.
_AMPERE_PER_SQUARE_VOLT = 44.0 / 7.0**2

#: The oscillator of the ADS1115 is within 10 % (from memory: SBAS444).
_OSCILLATOR_TOLERANCE = 0.1

_DAC_KNOTS = (0, 1024, 2048, 3072, 4095)
_THERMISTOR_DEGC = range(-40, 151, 5)


def draw_plant(board: BoardFile, seed: int) -> dict[str, Any]:
    """The actual circuit of the board number `seed` that was built to this board file."""
    part = _Parts(seed)
    reference_V = part.percent("dac reference", board.dac.reference_V, board.dac.reference_tolerance_percent)
    amplifier = board.amplifier
    return {
        "dac": {
            "part": board.dac.part,
            "pin": board.dac.pin,
            "address": board.dac.address,
            "reference_V": reference_V,
            "eeprom_code": 0,
            "inl": _nonlinearity(part, board),
        },
        "adc": _adc(part, board),
        "monitor": board.monitor
        and {
            "address": board.monitor.address,
            "pin": board.monitor.alert_pin,
            "shunt_ohm": board.monitor.shunt_ohm,
        },
        "current": _current(part, board),
        "voltage": _divider(part, "voltage", board.voltage_sense, board),
        "force": _divider(part, "force", board.force_sense, board),
        # The error amplifier is of the same kind as the sense amplifier: often the other half of its package.
        "setpoint_offset_V": part.within("setpoint offset", board.current_sense.amplifier_offset_V),
        "sense_pair": board.voltage_sense.pair,
        "loop": {
            "bandwidth_Hz": amplifier.loop_bandwidth_Hz,
            "rail_A": _AMPERE_PER_SQUARE_VOLT * (amplifier.output_high_V - amplifier.gate_threshold_V) ** 2,
        },
        "transistor": {
            "on_resistance_ohm": board.transistor.on_resistance_ohm,
            "stages": [list(stage) for stage in board.transistor.stages],
        },
        "case_to_sink": [board.transistor.case_to_sink_K_per_W, board.transistor.case_to_sink_s],
        "heatsink": [board.heatsink.K_per_W, board.heatsink.time_constant_s],
        "ambient_degC": AMBIENT_DEGC,
        "thermistor": _thermistor(part, board.thermistor.heatsink, board, reference_V),
        "defects": [],
    }


def draw_board_id(seed: int) -> bytes:
    """The eight bytes by which the board number `seed` is known."""
    return Random(f"{seed}/board id").randbytes(8)


def source_keys(source: SourceFile) -> dict[str, Any]:
    """The source as in its file, with `kind`; a key that was left out has its default or None."""
    keys: dict[str, Any] = msgspec.to_builtins(source)
    del keys["text"]
    return keys


class _Parts:
    """Rectangular errors, one generator for each part."""

    def __init__(self, seed: int) -> None:
        self._seed = seed

    def within(self, part: str, half_width: float) -> float:
        return Random(f"{self._seed}/{part}").uniform(-half_width, half_width)

    def percent(self, part: str, nominal: float, tolerance_percent: float) -> float:
        return nominal * (1 + self.within(part, tolerance_percent / 100))


def _nonlinearity(part: _Parts, board: BoardFile) -> list[list[float]]:
    """A bowed line through both ends, where gain and offset errors are told apart from it."""
    largest = board.dac.integral_nonlinearity_counts
    bends = [part.within(f"dac nonlinearity {code}", largest) for code in _DAC_KNOTS[1:-1]]
    return [[code, bend] for code, bend in zip(_DAC_KNOTS, (0.0, *bends, 0.0), strict=True)]


def _adc(part: _Parts, board: BoardFile) -> dict[str, Any]:
    adc = board.adc
    return {
        "part": adc.part,
        "address": adc.address,
        "supply_V": adc.supply_V,
        "gain": part.percent("adc gain", 1.0, adc.gain_tolerance_percent),
        "offset_counts": part.within("adc offset", adc.offset_counts),
        "noise_counts": adc.noise_counts,
        "window": 1 + part.within("adc oscillator", _OSCILLATOR_TOLERANCE),
        "inputs": {name: getattr(adc.inputs, name) for name in adc.inputs.__struct_fields__},
    }


def _current(part: _Parts, board: BoardFile) -> dict[str, float]:
    sense = board.current_sense
    drift = sense.resistance_drift_ppm_per_K * 1e-6
    return {
        "resistance_ohm": part.percent(
            "sense resistor", sense.resistance_ohm, sense.resistance_tolerance_percent
        ),
        "resistance_per_K": part.within("sense resistor drift", drift),
        "heating_K_per_W": sense.resistance_thermal_K_per_W,
        "gain": part.percent("sense gain", sense.amplifier_gain, sense.amplifier_gain_tolerance_percent),
        "offset_V": part.within("sense offset", sense.amplifier_offset_V),
        "pedestal_V": part.percent("sense pedestal", sense.pedestal_V, sense.pedestal_tolerance_percent),
        "rail_V": board.adc.supply_V - _RAIL_GAP_V,
    }


def _divider(part: _Parts, name: str, sense: VoltageSense | ForceSense, board: BoardFile) -> dict[str, float]:
    return {
        "ratio": part.percent(f"{name} ratio", sense.ratio, sense.ratio_tolerance_percent),
        "offset_V": part.within(f"{name} offset", sense.offset_V),
        "pedestal_V": part.percent(f"{name} pedestal", sense.pedestal_V, sense.pedestal_tolerance_percent),
        "rail_V": board.adc.supply_V - _RAIL_GAP_V,
    }


def _thermistor(part: _Parts, ntc: Ntc, board: BoardFile, reference_V: float) -> dict[str, Any]:
    r25 = part.percent("thermistor", ntc.r25_ohm, ntc.r25_tolerance_percent)
    curve = {"r25_ohm": r25, "curve": ntc.curve, "beta_K": ntc.beta_K}
    table = [[degC, resistance_ohm(degC, **curve)] for degC in _THERMISTOR_DEGC]
    return {
        # Equal supplies are one supply: the reference part's.
        "supply_V": reference_V if ntc.supply_V == board.dac.reference_V else ntc.supply_V,
        "pullup_ohm": part.percent("thermistor pull-up", ntc.pullup_ohm, ntc.pullup_tolerance_percent),
        "table": table,
    }
