"""What a report says of a plan, from the plan's own text: source, leads, decision rule, set-points and ends.

A record keeps the text as it was, perhaps of another version, so it is read leniently: what is missing is
"not stated". It judges nothing and knows no record.
"""

from __future__ import annotations

import tomllib
from dataclasses import dataclass
from typing import Any

_SETPOINTS = (
    "current_A", "power_W", "resistance_ohm", "voltage_V", "no_load_current_A", "full_load_current_A",
    "up_to_A", "rate_It", "first_current_A", "second_current_A",
)  # fmt: skip
_ENDS = (
    "end_voltage_V", "end_charge_Ah", "end_energy_Wh", "end_temperature_degC", "duration_s",
    "first_duration_s", "second_duration_s",
)  # fmt: skip
_RATINGS = ("rated_voltage_V", "rated_current_A", "rated_power_W", "capacity_Ah")
_UNITS = {
    "V": "V",
    "A": "A",
    "W": "W",
    "ohm": "Ω",
    "Ah": "Ah",
    "Wh": "Wh",
    "degC": "°C",
    "s": "s",
    "It": "It",
}
NOT_STATED = "not stated"


@dataclass(frozen=True)
class PlanFacts:
    """A plan's tables as they stand in its text; empty where the text is not TOML."""

    source: dict[str, Any]
    tests: tuple[dict[str, Any], ...]
    decision: str

    @classmethod
    def of(cls, text: str) -> PlanFacts:
        try:
            plan = tomllib.loads(text)
        except (tomllib.TOMLDecodeError, RecursionError):
            plan = {}
        tests = plan.get("test", [])
        source = plan.get("source", {})
        return cls(
            source=source if isinstance(source, dict) else {},
            tests=tuple(t for t in tests if isinstance(t, dict)) if isinstance(tests, list) else (),
            decision=str(plan.get("decision", "guarded")),
        )

    @property
    def source_in_words(self) -> str:
        """Name and ratings, e.g. "bench supply; rated voltage 12 V; rated current 2 A"."""
        facts = [str(self.source[key]) for key in ("name", "chemistry") if self.source.get(key)]
        facts += [_in_words(key, self.source[key]) for key in _RATINGS if key in self.source]
        return "; ".join(facts) or NOT_STATED

    @property
    def leads_in_words(self) -> str:
        """How the voltage was sensed, and what is known of the leads."""
        if self.source.get("sense", "remote") == "remote":
            return "remote sense: the voltage was read at the source's own terminals"
        ohm = self.source.get("lead_resistance_ohm")
        doubt = self.source.get("lead_resistance_uncertainty_ohm")
        if ohm is None:
            return "two wires: the voltage was read at the load; the leads' resistance is not known"
        return f"two wires: the leads' {ohm} Ω ± {doubt} Ω were taken into account"

    @property
    def setpoints_in_words(self) -> str:
        return self._of_tests(_SETPOINTS)

    @property
    def ends_in_words(self) -> str:
        return self._of_tests(_ENDS)

    def _of_tests(self, keys: tuple[str, ...]) -> str:
        lines = []
        for number, test in enumerate(self.tests, start=1):
            told = ", ".join(_in_words(key, test[key]) for key in keys if key in test)
            if told:
                lines.append(f"test {number} ({test.get('kind', 'no kind')}): {told}")
        return "; ".join(lines) or NOT_STATED


def _in_words(key: str, value: Any) -> str:
    """`rated_voltage_V = 12` as "rated voltage 12 V"."""
    name, _, unit = key.rpartition("_")
    return f"{name.replace('_', ' ')} {value} {_UNITS.get(unit, unit)}"
