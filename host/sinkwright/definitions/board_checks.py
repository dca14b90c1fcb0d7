"""What must hold between the values of one board file, and what would make it hold.

Each check works with the worst case of the tolerances and raises KeyMistake with the largest or smallest
value that fits. Knows nothing of files; called by BoardFile whenever one is made.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from typing import TYPE_CHECKING

from .. import thermistor
from .keys import KeyMistake

if TYPE_CHECKING:
    from .board import BoardFile

_NAME_BYTES = 16
#: Every product stays below 2**30 in the firmware: 4095 codes * uA_per_code_x64, 32767 counts * whole.
_LARGEST_DAC_A = (1 << 30) / 4096 / 64 * 4095 / 1e6
#: What the firmware's meter holds (firmware/meter.py).
_LARGEST_CURRENT_A = 12.0
_LARGEST_VOLTAGE_V = 80.0
#: Bits on the bus in the busiest step: DAC write, conversion begun, config and result read (9 bits a byte).
_BUS_BITS = 170
#: Ripple of mains rectifiers: 50 and 60 Hz grids, one and two pulses, and their harmonics.
_RIPPLE_HZ = tuple(sorted({base * n for base in (50, 60, 100, 120) for n in range(1, 5)}))
_LEAST_BEAT_HZ = 1.0
_LEAST_COUNTS_PER_K = 5.0
_OPEN_SHARE = 0.99


def check_board(board: BoardFile) -> None:
    """Raises KeyMistake for the first thing that does not hold."""
    for check in (
        _name,
        _pins,
        _demand_reaches,
        _current_is_read,
        _voltages_are_read,
        _zero_is_read,
        _integers_fit,
        _heat_is_carried_away,
        _step_is_long_enough,
        _ripple_averages_out,
        _thermistor_is_read,
        _bands,
    ):
        check(board)


def _name(board: BoardFile) -> None:
    size = len(board.name.encode())
    if size > _NAME_BYTES or not board.name.isprintable() or not board.name.strip():
        raise KeyMistake(
            "name",
            f'"{board.name}" has {size} bytes'
            if size > _NAME_BYTES
            else "has characters that cannot be shown",
            f"choose 1 to {_NAME_BYTES} printable bytes (a letter with an accent takes two)",
        )


def _pins(board: BoardFile) -> None:
    users = {board.i2c.sda: "i2c.sda", board.i2c.scl: "i2c.scl"}
    if len(users) < 2:
        raise KeyMistake("i2c.scl", "is the same pin as i2c.sda", "give each its own")
    for name in board.pins.__struct_fields__:
        pin = getattr(board.pins, name)
        other = users.setdefault(pin, f"pins.{name}") if pin is not None else f"pins.{name}"
        if other != f"pins.{name}":
            raise KeyMistake(f"pins.{name}", f"GPIO {pin} is taken by {other}", "give each its own")
    if board.dac.address == board.adc.address:
        raise KeyMistake("adc.address", "is the DAC's too", "give each its own bus address")


def _output_range(board: BoardFile, converter_V: float) -> float:
    """Largest current whose sense voltage stays within `converter_V` with every tolerance against us."""
    sense = board.current_sense
    pedestal_V = sense.pedestal_V * (1 + sense.pedestal_tolerance_percent / 100)
    offset_V = sense.amplifier_offset_V * sense.amplifier_gain
    tolerance = (sense.resistance_tolerance_percent + sense.amplifier_gain_tolerance_percent) / 100
    return (converter_V - pedestal_V - offset_V) / (sense.V_per_A * (1 + tolerance))


def _demand_reaches(board: BoardFile) -> None:
    top_V = board.dac.code_V * 4095 * (1 - board.dac.reference_tolerance_percent / 100)
    _current_fits(board, "the DAC", top_V)


def _current_is_read(board: BoardFile) -> None:
    _current_fits(board, "the ADC", min(board.adc.range_V, board.adc.supply_V))


def _current_fits(board: BoardFile, who: str, top_V: float) -> None:
    largest_A = _output_range(board, top_V)
    if board.limits.current_A > largest_A:
        right = f"lower it to {_down(largest_A)} A, or choose a smaller resistance_ohm or amplifier_gain"
        if largest_A <= 0:
            right = "lower the pedestal, or choose another range"
        raise KeyMistake(
            "limits.current_A",
            f"{board.limits.current_A:g} A exceeds {who}, which ends at {top_V:.3g} V from the amplifier",
            right,
        )


def _voltages_are_read(board: BoardFile) -> None:
    top_V = min(board.adc.range_V, board.adc.supply_V)
    for name, sense in (("voltage_sense", board.voltage_sense), ("force_sense", board.force_sense)):
        pedestal_V = sense.pedestal_V * (1 + sense.pedestal_tolerance_percent / 100) + sense.offset_V
        room_V = (top_V - pedestal_V) * (1 - sense.ratio_tolerance_percent / 100)
        if room_V <= 0:
            raise KeyMistake(
                f"{name}.pedestal_V", "leaves the ADC no room", f"keep it well below {top_V:g} V"
            )
        if board.limits.voltage_V > room_V * sense.ratio:
            ratio = board.limits.voltage_V / room_V
            raise KeyMistake(
                f"{name}.ratio",
                f"limits.voltage_V = {board.limits.voltage_V:g} V would exceed the ADC's {top_V:g} V",
                f"choose at least {_up(ratio)}, or a limit of at most {_down(room_V * sense.ratio)} V",
            )


def _zero_is_read(board: BoardFile) -> None:
    sense, adc = board.current_sense, board.adc
    error_V = sense.amplifier_offset_V * sense.amplifier_gain + adc.offset_counts * adc.count_V
    least_V = error_V / (1 - sense.pedestal_tolerance_percent / 100)
    if sense.pedestal_V <= least_V:
        raise KeyMistake(
            "current_sense.pedestal_V",
            f"{sense.pedestal_V:g} V may be less than the offsets, and then the zero cannot be read",
            f"choose more than {_up(least_V)} V",
        )


def _integers_fit(board: BoardFile) -> None:
    sense = board.current_sense
    dac_A = board.dac.code_V * 4095 / sense.V_per_A
    if dac_A > _LARGEST_DAC_A:
        raise KeyMistake(
            "current_sense.amplifier_gain",
            f"with {sense.V_per_A:g} V/A the DAC spans {dac_A:.3g} A, more than the firmware's integers hold",
            f"choose resistance and gain so that it spans at most {_down(_LARGEST_DAC_A)} A",
        )
    for key, per_count, pedestal_V, largest, unit in (
        (
            "current_sense.amplifier_gain",
            board.adc.count_V / sense.V_per_A,
            sense.pedestal_V,
            _LARGEST_CURRENT_A,
            "A",
        ),
        (
            "voltage_sense.ratio",
            board.adc.count_V * board.voltage_sense.ratio,
            board.voltage_sense.pedestal_V,
            _LARGEST_VOLTAGE_V,
            "V",
        ),
        (
            "force_sense.ratio",
            board.adc.count_V * board.force_sense.ratio,
            board.force_sense.pedestal_V,
            _LARGEST_VOLTAGE_V,
            "V",
        ),
    ):
        if per_count * 1e6 < 1:
            raise KeyMistake(
                key,
                f"gives {per_count * 1e6:.3g} u{unit} per count, finer than the firmware's integers",
                f"choose it so that one count is at least 1 u{unit}",
            )
        # The lowest code lies farthest from zero, because the pedestal lifts the zero.
        span = per_count * 32768 + pedestal_V / board.adc.count_V * per_count
        if span > largest:
            raise KeyMistake(
                key,
                f"lets the converter span {span:.3g} {unit}, more than the {largest:g} {unit} that the firmware's "
                "integers hold",
                f"choose it, or adc.range_V, so that the lowest code means at most {largest:g} {unit}",
            )


def _heat_is_carried_away(board: BoardFile) -> None:
    """Steady state (JESD51: temperatures add up along the chain)."""
    limits, sink = board.limits, board.heatsink
    chain = {
        "heatsink_degC": (limits.heatsink_degC, sink.K_per_W),
        "junction_degC": (limits.junction_degC, sink.K_per_W + board.transistor.junction_to_sink_K_per_W),
    }
    most_W = min((top_degC - sink.ambient_degC) / resistance for top_degC, resistance in chain.values())
    for key, (top_degC, resistance) in chain.items():
        reached_degC = sink.ambient_degC + limits.power_W * resistance
        if reached_degC > top_degC:
            lower = f"lower it to {_down(most_W)} W" if most_W > 0 else f"raise limits.{key}"
            raise KeyMistake(
                "limits.power_W",
                f"{limits.power_W:g} W from {sink.ambient_degC:g} degC over {resistance:.3g} K/W ends at "
                f"{reached_degC:.0f} degC, above limits.{key} = {top_degC:g} degC",
                f"{lower}, or take a better heatsink",
            )


def _step_is_long_enough(board: BoardFile) -> None:
    least_s = board.adc.conversion_us * 1e-6 + _BUS_BITS / board.i2c.frequency_Hz
    if board.control.period_s < least_s:
        raise KeyMistake(
            "control.period_s",
            f"{board.control.period_s:g} s is too short: conversion and bus take {least_s * 1e3:.2f} ms",
            f"choose at least {_up(least_s)} s, or a faster bus or converter rate",
        )


def _ripple_averages_out(board: BoardFile) -> None:
    """Sampled once in two steps, ripple at a multiple of the rate would look like a constant."""
    rate_Hz = 0.5 / board.control.period_s
    for ripple_Hz in _RIPPLE_HZ:
        beat_Hz = abs(ripple_Hz - rate_Hz * round(ripple_Hz / rate_Hz))
        if beat_Hz < _LEAST_BEAT_HZ:
            raise KeyMistake(
                "control.period_s",
                f"{board.control.period_s:g} s reads each quantity {rate_Hz:.4g} times a second, "
                f"so that ripple at {ripple_Hz} Hz would look like a constant error",
                "choose e.g. 0.00235",
            )


def _thermistor_is_read(board: BoardFile) -> None:
    ntc, where = board.thermistor.heatsink, "thermistor.heatsink"
    if ntc.supply_V > min(board.adc.range_V, board.adc.supply_V):
        raise KeyMistake(
            f"{where}.supply_V", "exceeds what the ADC reads", "take the pull-up to the ADC's supply"
        )
    kind = {"r25_ohm": ntc.r25_ohm, "curve": ntc.curve, "beta_K": ntc.beta_K}
    counts = ntc.supply_V / board.adc.count_V

    def share(degC: float) -> float:
        return thermistor.divider_share(thermistor.resistance_ohm(degC, **kind), ntc.pullup_ohm)

    right = f"choose pullup_ohm near {ntc.r25_ohm:g} ohm"
    if share(thermistor.TABLE_COLDEST_DEGC) > _OPEN_SHARE:
        raise KeyMistake(
            f"{where}.pullup_ohm", "is so small that a cold thermistor looks like an open one", right
        )
    for degC in (-20.0, 125.0):
        if counts * abs(share(degC + 0.5) - share(degC - 0.5)) < _LEAST_COUNTS_PER_K:
            raise KeyMistake(
                f"{where}.pullup_ohm",
                f"leaves fewer than {_LEAST_COUNTS_PER_K:g} counts per kelvin at {degC:g} degC",
                right,
            )
    try:
        thermistor.divider_table(counts, ntc.pullup_ohm, **kind)
    except ValueError as error:
        raise KeyMistake(f"{where}.pullup_ohm", f"does not suit the thermistor: {error}", right) from error


def _bands(board: BoardFile) -> None:
    if board.off_current_A <= board.zero_budget_A:
        raise KeyMistake(
            "protection.off_current_A",
            f"{board.off_current_A:g} A is not above the zero budget of {board.zero_budget_A:.3g} A",
            "choose more, or every zero within its budget would count as current although off",
        )
    if max(board.off_current_A, board.demand_margin_A) >= board.limits.current_A:
        raise KeyMistake(
            "protection",
            "its bands are as wide as the current limit",
            "choose smaller ones, or leave them out",
        )


def _down(value: float) -> str:
    """Three figures, rounded down, so that the value offered does fit."""
    return _three(value, math.floor)


def _up(value: float) -> str:
    return _three(value, math.ceil)


def _three(value: float, rounding: Callable[[float], int]) -> str:
    digits = 2 - math.floor(math.log10(abs(value))) if value else 0
    rounded = rounding(value * 10.0**digits) / 10.0**digits
    return f"{rounded:.{digits}f}".rstrip("0").rstrip(".") if digits > 0 else f"{rounded:.0f}"
