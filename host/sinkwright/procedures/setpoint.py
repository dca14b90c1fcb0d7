"""A hold's set-point in any of the four modes: how it is asked for, said, and what it will draw.

What a mode draws follows from the source's voltage (I = P/V, I = V/R); constant voltage draws whatever the
source gives, so there a stated current stands for the most. It must not know boards or procedures.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Self

from sinkwright.definitions.plan import Hold

if TYPE_CHECKING:
    from sinkwright.definitions.plan import SourceUnderTest
    from sinkwright.instrument import Instrument


@dataclass(frozen=True)
class SetPoint:
    """`key` is the plan's: current_A, power_W, resistance_ohm or voltage_V."""

    key: str
    value: float

    @classmethod
    def of(cls, test: Hold) -> Self:
        """The one set-point that a hold has (its definition allows no other number)."""
        given = {
            "current_A": test.current_A,
            "power_W": test.power_W,
            "resistance_ohm": test.resistance_ohm,
            "voltage_V": test.voltage_V,
        }
        key, value = next((key, value) for key, value in given.items() if value is not None)
        return cls(key, value)

    async def ask(self, instrument: Instrument) -> None:
        """Tell the load."""
        if self.key == "current_A":
            await instrument.set_current(self.value)
        elif self.key == "power_W":
            await instrument.set_power(self.value)
        elif self.key == "resistance_ohm":
            await instrument.set_resistance(self.value)
        else:
            await instrument.set_voltage(self.value)

    @property
    def demand_A(self) -> float | None:
        """The current asked for, where it is a current that is asked for."""
        return self.value if self.key == "current_A" else None

    @property
    def in_words(self) -> str:
        """What the load does, as the end of a sentence: "sinks 1.500 A"."""
        verb, unit = _WORDS[self.key]
        return f"{verb} {self.value:.3f} {unit}"

    def current_at(self, voltage_V: float, most_A: float = 0.0) -> float:
        """What it draws at a voltage, in A. `most_A`: the most that may flow, for a constant voltage."""
        if self.key == "current_A":
            return self.value
        if self.key == "power_W":
            return self.value / voltage_V if voltage_V > 0 else 0.0
        if self.key == "resistance_ohm":
            return voltage_V / self.value
        return most_A

    def most_current(self, test: Hold, source: SourceUnderTest, most_A: float) -> float:
        """The largest current of a whole hold, in A, as far as the plan tells; 0 where it does not."""
        rated_V = source.rated_voltage_V or 0.0
        if self.key == "power_W":
            # The current rises as the voltage falls, to the end voltage if there is one.
            return self.current_at(min(test.end_voltage_V or rated_V, rated_V or test.end_voltage_V or 0.0))
        return self.current_at(rated_V, most_A)

    def power_at(self, voltage_V: float, most_A: float = 0.0) -> float:
        """What it turns into heat at a voltage, in W."""
        if self.key == "power_W":
            return self.value
        held_V = min(self.value, voltage_V) if self.key == "voltage_V" else voltage_V
        return held_V * self.current_at(voltage_V, most_A)

    def within(self, limit_W: float, voltage_V: float) -> str:
        """How much may be asked for so that no more than `limit_W` is drawn at `voltage_V`: a sentence."""
        if self.key == "power_W":
            return f"Ask for at most {limit_W:g} W."
        if self.key == "resistance_ohm":
            return f"Ask for at least {_up(voltage_V**2 / limit_W)} ohm at this voltage."
        if self.key == "voltage_V":
            return f"Let at most {_down(limit_W / self.value)} A flow: current_A in [limits]."
        return f"Ask for at most {_down(limit_W / voltage_V)} A at this voltage."

    def drawing(self, limit_A: float, voltage_V: float | None) -> str:
        """How much may be asked for so that no more than `limit_A` flows: a sentence."""
        if self.key == "resistance_ohm" and voltage_V:
            return f"Ask for at least {_up(voltage_V / limit_A)} ohm at {voltage_V:g} V."
        if self.key == "power_W" and voltage_V:
            return f"Ask for less power, or end at a higher voltage: {limit_A:g} A is the most."
        if self.key == "voltage_V":
            return (
                f"A constant voltage takes what the source gives: write current_A = {limit_A:g} in [limits]."
            )
        return f"The largest that fits is {limit_A:g} A."


_WORDS = {
    "current_A": ("sinks", "A"),
    "power_W": ("draws a constant", "W"),
    "resistance_ohm": ("is a resistance of", "ohm"),
    "voltage_V": ("holds the source at", "V"),
}


def _down(value: float) -> str:
    """To three decimals, never rounded up: what is named must fit."""
    return f"{int(value * 1000) / 1000:.3f}"


def _up(value: float) -> str:
    return f"{int(value * 1000 + 0.999999) / 1000:.3f}"
