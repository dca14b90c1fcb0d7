"""The rows whose fault lies in the circuit: bus, chips, sensors, leads, source, transistor, cooling."""

from __future__ import annotations

from typing import Any

from .rows import NOTHING, ONSET_us, Outcome, Row


def one(kind: str, **more: Any) -> tuple[dict[str, Any], ...]:
    return ({"kind": kind, **more},)


_LOWER = [20_000, "SET_POINT", 1, 200_000]
_WARM = [-149_000_000, "SET_POINT", 1, 2_500_000]
_OFF = [20_000, "DISABLE"]
#: What holds its voltage whatever is drawn, as a battery does.
_BATTERY = """kind = "supply"
voltage_V = 12.0
resistance_ohm = 0.045
leads_ohm = 0.02
"""
_WARMING_s = 150


def _quick(key: str, fault: str, detected_as: tuple[str, ...], bound: int, kind: str, **more: Any) -> Row:
    return Row(key, fault, detected_as, bound, defects=one(kind), **more)


def _at_boot(chip: str) -> Row:
    name = chip.upper()
    return Row(
        f"{chip} missing at boot",
        f"{name} missing at boot",
        ("SELF_TEST",),
        12,
        defects=one(f"{chip}_silent"),
        at_boot=True,
    )


BUS_AND_CHIPS = (
    _quick("bus stuck low", "I2C line held low", ("ADC_SILENT",), 2, "bus_stuck_low"),
    _at_boot("adc"),
    _at_boot("dac"),
    _quick("adc missing in a run", "ADC gone in the middle of a run", ("ADC_SILENT",), 2, "adc_silent"),
    _quick(
        "dac missing in a run",
        "DAC gone in the middle of a run, set-point lowered 20 ms later",
        ("DAC_SILENT",),
        14,
        "dac_silent",
        commands=[_LOWER],
    ),
    _quick(
        "adc not converting", "ADC answers, never ready", ("ADC_NOT_CONVERTING",), 11, "adc_not_converting"
    ),
    _quick(
        "adc idle",
        "ADC answers, says ready, converts nothing",
        ("CONVERTER_STUCK", "CURRENT_ABOVE_DEMAND"),
        140,
        "adc_idle",
    ),
    _quick(
        "adc bit 15 stuck",
        "ADC's bit 15 stuck high",
        ("REVERSED_SOURCE", "THERMISTOR_SHORT"),
        4,
        "adc_bit_15",
    ),
    _quick(
        "adc bit 14 stuck",
        "ADC's bit 14 stuck high",
        ("OVER_VOLTAGE", "CURRENT_ABOVE_DEMAND"),
        4,
        "adc_bit_14",
    ),
    _quick(
        "dac stuck",
        "DAC's output stuck, set-point lowered 20 ms later",
        ("CURRENT_ABOVE_DEMAND",),
        20,
        "dac_stuck",
        commands=[_LOWER],
    ),
)
SENSORS_AND_COOLING = (
    _quick("thermistor open", "Thermistor open", ("THERMISTOR_OPEN",), 68, "thermistor_open"),
    _quick("thermistor shorted", "Thermistor shorted", ("THERMISTOR_SHORT",), 68, "thermistor_short"),
    _quick(
        "thermistor loose",
        "Thermistor fallen off the heatsink, 30 W",
        ("THERMISTOR_LOOSE",),
        6_000,
        "thermistor_loose",
        commands=[_WARM],
        onset_us=_WARMING_s * 1_000_000,
        phases=1,
        periods_a_grant=20,
    ),
    _quick(
        "fan dead",
        "Fan dead, 30 W",
        ("COOLING_WEAK",),
        200_000,
        "fan_dead",
        commands=[_WARM],
        onset_us=_WARMING_s * 1_000_000,
        phases=1,
        periods_a_grant=20,
    ),
    _quick("sense open", "Sense lead open", ("SENSE_LEAD",), 206, "sense_open"),
    _quick("sense swapped", "Sense leads swapped", ("SENSE_LEAD", "REVERSED_SOURCE"), 68, "sense_swapped"),
)
POWER_PATH = (
    _quick(
        "sense resistor open",
        "Sense resistor open, during a conversion of the current",
        ("CURRENT_ABOVE_DEMAND", "OVER_CURRENT"),
        4,
        "resistor_open",
        onset_us=ONSET_us + 1_000,
        phases=1,
    ),
    _quick(
        "sense resistor open, unseen",
        "Sense resistor open between two conversions of the current, load turned off 20 ms later: the readback goes on "
        "telling what was asked",
        (NOTHING,),
        20,
        "resistor_open",
        commands=[_OFF],
        phases=1,
        most_A=0.1,
    ),
    Row(
        "sense resistor shorted",
        "Sense resistor shorted, at a battery; the transistor fails shorted 5 ms later of 400 W",
        ("CURRENT_ALTHOUGH_OFF",),
        20,
        Outcome.DISCONNECT,
        defects=one("resistor_shorted") + one("transistor_short", from_us=5_000),
        source=_BATTERY,
    ),
    _quick(
        "drive dead", "DAC's output dead: no current although asked for", ("CURRENT_MISSING",), 40, "dac_dead"
    ),
    _quick(
        "clamp ineffective",
        "Gate clamp ineffective, load turned off 20 ms later: the DAC at nothing stops it alone",
        (NOTHING,),
        20,
        "clamp_ineffective",
        commands=[_OFF],
    ),
    Row(
        "clamp ineffective, dac stuck",
        "Gate clamp ineffective and DAC stuck, load turned off 20 ms later",
        ("CURRENT_ALTHOUGH_OFF",),
        24,
        Outcome.DISCONNECT,
        defects=one("clamp_ineffective") + one("dac_stuck"),
        commands=[_OFF],
    ),
    _quick(
        "source reversed",
        "Source reversed",
        ("REVERSED_SOURCE",),
        4,
        "source_reversed",
        outcome=Outcome.DISCONNECT,
    ),
    Row(
        "source too high",
        "Source's voltage over the limit",
        ("OVER_VOLTAGE",),
        4,
        defects=one("source_high", value=33.0),
    ),
    _quick(
        "source disconnected",
        "Source disconnected under load (a state, no fault)",
        (NOTHING,),
        4,
        "source_disconnected",
    ),
    Row(
        "source reconnected",
        "Source disconnected for 0.2 s, load turned off after 0.6 s: largest current on its return",
        (NOTHING,),
        4,
        defects=one("source_disconnected", until_us=200_000),
        commands=[[600_000, "DISABLE"]],
        source=_BATTERY,
        afterwards_us=800_000,
        most_A=1.1,
    ),
    _quick(
        "transistor shorted",
        "Transistor shorted",
        ("CURRENT_ALTHOUGH_OFF",),
        14,
        "transistor_short",
        outcome=Outcome.DISCONNECT,
    ),
)
ROWS = BUS_AND_CHIPS + SENSORS_AND_COOLING + POWER_PATH
