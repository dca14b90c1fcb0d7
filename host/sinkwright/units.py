"""Quantities by name: their units and what people call them; and values written as people write them.

A result is rounded to what its uncertainty supports: two significant figures of the uncertainty, and the
value to the same decimal (JCGM 100, 7.2.6). It must not know where values come from.
"""

from __future__ import annotations

import math
from dataclasses import dataclass


@dataclass(frozen=True)
class QuantityKind:
    """`symbol` stands behind a number, `key` at the end of the quantity's name, `label` before a colon."""

    symbol: str
    key: str
    label: str


#: Symbol by unit key: the endings of quantity names and of keys in plans.
SYMBOLS = {
    "V": "V",
    "A": "A",
    "W": "W",
    "ohm": "Ω",
    "percent": "%",
    "Ah": "Ah",
    "Wh": "Wh",
    "s": "s",
    "degC": "°C",
    "C": "C",
}

#: Units that take a prefix; beyond milli and micro only those where people say kilo.
_SMALL_PREFIXES = frozenset({"V", "A", "W", "Ω", "s", "Ah", "Wh", "C"})
_KILO = frozenset({"W", "Ω", "Wh"})

#: Figures of a value that has no uncertainty to say how many it deserves.
_PLAIN_FIGURES = 5


def _kinds(labels: dict[str, str]) -> dict[str, QuantityKind]:
    kinds = {}
    for name, label in labels.items():
        key = name.rsplit("_", 1)[1]
        kinds[name] = QuantityKind(SYMBOLS[key], key, label)
    return kinds


QUANTITIES: dict[str, QuantityKind] = _kinds(
    {
        "load_regulation_percent": "Load regulation",
        "output_resistance_ohm": "Output resistance",
        "no_load_voltage_V": "No-load voltage",
        "full_load_voltage_V": "Full-load voltage",
        "current_limit_A": "Current limit",
        "short_circuit_current_A": "Short-circuit current",
        "transient_deviation_V": "Transient deviation",
        "recovery_time_s": "Recovery time",
        "efficiency_percent": "Efficiency",
        "dropout_voltage_V": "Dropout voltage",
        "drift_V": "Drift",
        "capacity_Ah": "Capacity",
        "energy_Wh": "Energy",
        "duration_s": "Duration",
        "dc_resistance_ohm": "DC resistance",
        "maximum_power_W": "Maximum power",
        "voltage_at_maximum_power_V": "Voltage at maximum power",
        "current_at_maximum_power_A": "Current at maximum power",
        "open_circuit_voltage_V": "Open-circuit voltage",
        "lead_resistance_ohm": "Lead resistance",
        "voltage_V": "Voltage",
        "current_A": "Current",
        "power_W": "Power",
        "resistance_ohm": "Resistance",
    }
)


def format_value(value: float, uncertainty: float | None, unit: str) -> str:
    """Such as 12.052 V ± 0.037 V. `unit` is a symbol or a unit key; without uncertainty, five figures."""
    symbol = SYMBOLS.get(unit, unit)
    if not math.isfinite(value) or (uncertainty is not None and not math.isfinite(uncertainty)):
        return "not a number"
    if not uncertainty:
        factor, prefix = _prefix(abs(value), symbol)
        return f"{_plain(value / factor)} {prefix}{symbol}"
    factor, prefix = _prefix(max(abs(value), uncertainty), symbol)
    decimals = _decimals(uncertainty / factor, 2)
    return (
        f"{_fixed(value / factor, decimals)} {prefix}{symbol} ± "
        f"{_fixed(uncertainty / factor, decimals)} {prefix}{symbol}"
    )


def format_uncertainty(uncertainty: float, unit: str) -> str:
    """Such as 0.037 V: a half-width by itself, in two significant figures."""
    symbol = SYMBOLS.get(unit, unit)
    if not math.isfinite(uncertainty):
        return "not a number"
    factor, prefix = _prefix(uncertainty, symbol)
    return f"{_fixed(uncertainty / factor, _decimals(uncertainty / factor, 2))} {prefix}{symbol}"


def two_figures(number: float) -> str:
    """A bare number in two significant figures, without exponent."""
    return _fixed(number, _decimals(number, 2))


def _prefix(size: float, symbol: str) -> tuple[float, str]:
    """From a tenth to a thousand people write no prefix: 0.85 A, but 45 mV."""
    if size >= 1000 and symbol in _KILO:
        return 1e3, "k"
    if size >= 0.1 or size == 0 or symbol not in _SMALL_PREFIXES:
        return 1.0, ""
    return (1e-3, "m") if size >= 1e-4 else (1e-6, "µ")


def _decimals(number: float, figures: int) -> int:
    """Decimal places that leave so many significant figures; negative: whole tens, hundreds."""
    if number == 0:
        return 0
    decimals = figures - 1 - math.floor(math.log10(abs(number)))
    # 0.0996 is 0.10 in two figures, not 0.100.
    if round(abs(number), decimals) >= 10 ** (figures - decimals):
        decimals -= 1
    return decimals


def _fixed(number: float, decimals: int) -> str:
    text = f"{round(number, decimals):.{max(decimals, 0)}f}"
    # An uncertain nothing has no sign.
    return text.lstrip("-") if float(text) == 0 else text


def _plain(number: float) -> str:
    return _fixed(number, min(max(_decimals(number, _PLAIN_FIGURES), 0), 9))
