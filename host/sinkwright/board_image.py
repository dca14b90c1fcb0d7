"""Turns a board file into the integers that the firmware works with.

Decides every rounding, once, where it can be tested; the firmware only applies the numbers (its scaling.py
and thermal.py say how). Units are in the names: uA, uV, mC, mK. Knows no link and no device.

Rounding. A scale is split into whole and part: reading = n*whole + (n*part >> 14) with part the nearest to
2**14 * fraction. The part errs by at most 2**-15 per count, so a full-scale reading errs by at most 1 uA
or uV from it, and 1 more from the shift. Zero counts and the DAC's zero code are the nearest: what is left of
the zero, below half a count or code, belongs to the current zero that the board measures before each run.

`python -m sinkwright.board_image BOARD.toml` prints the image as the JSON that a real board keeps in board.json.
"""

from __future__ import annotations

import json
import math
import sys
import zlib
from pathlib import Path
from typing import Any

from .definitions.board import DAC_CODES, GAIN_BITS, RATE_BITS, BoardFile, Ntc
from .definitions.parts import MONITOR_COUNT_V, MONITOR_SHARE
from .guard_image import guard_image
from .thermistor import divider_table

IMAGE_VERSION = 1
PART_BITS = 14
CODE_BITS = 6
SHARE_ONE = 32768
#: The least part of its way that a stage goes at a time: rounding it then errs by less than 0.1 % of the time constant,
#: and a slow stage costs the control step no more than it must. Between two moves it lags by less than 5 % of its time.
_LEAST_SHARE = 1500
#: The firmware's thermal.py: quick stages move every second step, slow ones by turns within 512 steps.
_QUICK_STEPS, _SLOWEST_STEPS = 2, 512


def compile_board(board: BoardFile) -> dict[str, Any]:
    """The board image: plain integers, texts, lists and tables, ready for JSON."""
    thermistor = _thermistor(board.thermistor.heatsink, board.adc.count_V)
    return {
        "image": IMAGE_VERSION,
        "name": board.name,
        "board_file_crc": zlib.crc32(board.text.encode()),
        "period_us": period_us(board),
        "pins": _pins(board),
        "i2c": {
            "id": board.i2c.id,
            "scl": board.i2c.scl,
            "sda": board.i2c.sda,
            "frequency_Hz": board.i2c.frequency_Hz,
        },
        "dac": _dac(board),
        "adc": _adc(board),
        **_monitor(board),
        "scales": _scales(board),
        "thermistor": thermistor,
        "thermal": {"stages": _stages(board)},
        "limits": _limits(board),
        "zero_budget_uA": _uA(board.zero_budget_A),
        "off_current_uA": _uA(board.off_current_A),
        "demand_margin_uA": _uA(board.demand_margin_A),
        **guard_image(board),
    }


def period_us(board: BoardFile) -> int:
    return round(board.control.period_s * 1e6)


def split(per_count: float) -> dict[str, int]:
    """`whole` and `part` of a scale in units per count, `part` in 2**-14."""
    whole = math.floor(per_count)
    part = round((per_count - whole) * (1 << PART_BITS))
    if part == 1 << PART_BITS:
        whole, part = whole + 1, 0
    return {"whole": whole, "part": part}


def _uA(current_A: float) -> int:
    """A band's width, never narrower than asked; a nanoampere is the binary fraction's own error."""
    return math.ceil(round(current_A * 1e6, 3))


def _pins(board: BoardFile) -> dict[str, int | None]:
    pins = board.pins
    return {name: getattr(pins, name) for name in pins.__struct_fields__}


def _dac(board: BoardFile) -> dict[str, Any]:
    dac, sense = board.dac, board.current_sense
    own = {} if dac.pin is None else {"pin": dac.pin, "frequency_Hz": dac.frequency_Hz}
    return own | {
        "part": dac.part,
        "address": dac.address,
        "zero_code": round(sense.pedestal_V / dac.code_V),
        "uA_per_code_x64": round(dac.code_V / sense.V_per_A * 1e6 * (1 << CODE_BITS)),
        "full_code": DAC_CODES - 1,
    }


def _adc(board: BoardFile) -> dict[str, Any]:
    adc = board.adc
    return {
        "part": adc.part,
        "address": adc.address,
        "gain_bits": GAIN_BITS.get(adc.range_V, 0),
        "rate_bits": RATE_BITS.get(adc.samples_per_s, 0),
        "conversion_us": adc.conversion_us,
        "inputs": {name: getattr(adc.inputs, name) for name in adc.inputs.__struct_fields__},
    }


def _monitor(board: BoardFile) -> dict[str, Any]:
    monitor = board.monitor
    if monitor is None:
        return {}
    limit_A = board.limits.current_A * MONITOR_SHARE
    return {
        "monitor": {
            "part": monitor.part,
            "address": monitor.address,
            "pin": monitor.alert_pin,
            "limit_uA": round(limit_A * 1e6),
            "limit_counts": round(limit_A * monitor.shunt_ohm / MONITOR_COUNT_V),
        }
    }


def _scales(board: BoardFile) -> dict[str, dict[str, int]]:
    count_V = board.adc.count_V

    def scale(per_count: float, pedestal_V: float) -> dict[str, int]:
        return {"zero_counts": round(pedestal_V / count_V), **split(per_count)}

    current, voltage, force = board.current_sense, board.voltage_sense, board.force_sense
    return {
        "current": scale(count_V / current.V_per_A * 1e6, current.pedestal_V),
        "voltage": scale(count_V * voltage.ratio * 1e6, voltage.pedestal_V),
        "force": scale(count_V * force.ratio * 1e6, force.pedestal_V),
    }


def _thermistor(ntc: Ntc, count_V: float) -> dict[str, Any]:
    table = divider_table(
        ntc.supply_V / count_V, ntc.pullup_ohm, r25_ohm=ntc.r25_ohm, curve=ntc.curve, beta_K=ntc.beta_K
    )
    return {
        "counts": [counts for counts, _ in table],
        "mC": [mC for _, mC in table],
        "open_counts": table[-1][0],
        "short_counts": table[0][0],
    }


def _stages(board: BoardFile) -> list[dict[str, int]]:
    """Foster stages from the junction to the thermistor's place, quickest first.

    The sink's own stage is left out: the thermistor measures it. A stage moves as often as the power is
    measured, unless its share of so short a time would be rounded badly; such slow ones take turns, each at
    most half as often as the one before.
    """
    transistor, period_s = board.transistor, board.control.period_s
    chain = [*transistor.stages, (transistor.case_to_sink_K_per_W, transistor.case_to_sink_s)]
    stages: list[dict[str, int]] = []
    next_slow = 2 * _QUICK_STEPS
    for resistance_K_per_W, time_s in sorted(chain, key=lambda stage: stage[1]):
        every = _QUICK_STEPS
        if _share(every, period_s, time_s) < _LEAST_SHARE:
            every = next_slow
            while _share(every, period_s, time_s) < _LEAST_SHARE and every < _SLOWEST_STEPS:
                every *= 2
            next_slow = min(2 * every, _SLOWEST_STEPS)
        stages.append(
            {
                "r_mK_per_W": max(1, round(resistance_K_per_W * 1000)),
                "every_steps": every,
                "share_x32768": max(1, round(_share(every, period_s, time_s))),
            }
        )
    return stages


def _share(every: int, period_s: float, time_s: float) -> float:
    return SHARE_ONE * -math.expm1(-every * period_s / time_s)


def _limits(board: BoardFile) -> dict[str, int]:
    limits = board.limits
    return {
        "current_uA": round(limits.current_A * 1e6),
        "voltage_uV": round(limits.voltage_V * 1e6),
        "power_uW": round(limits.power_W * 1e6),
        "heatsink_mC": round(limits.heatsink_degC * 1000),
        "junction_mC": round(limits.junction_degC * 1000),
        "slew_uA_per_ms": round(limits.slew_A_per_s * 1000),
        "silence_ms": round(limits.host_silence_s * 1000),
    }


def main(arguments: list[str]) -> int:
    """Print the image of the board file named, or say in one paragraph why there is none."""
    from .definitions.loading import load_board
    from .errors import SinkwrightError

    if len(arguments) != 1:
        sys.stderr.write("usage: python -m sinkwright.board_image BOARD.toml\n")
        return 2
    try:
        image = compile_board(load_board(Path(arguments[0])))
    except SinkwrightError as error:
        sys.stderr.write(f"{error}\n")
        return error.exit_code
    sys.stdout.write(json.dumps(image) + "\n")
    return 0


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
