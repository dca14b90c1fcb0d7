"""What a test would draw, heat and take, as far as it can be known before the source is seen.

Pure arithmetic over a plan and a board file: the largest current and power, charge, time, and how hot the
heatsink would get from 25 degC. What is refused because of it is the preflight's business.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import TYPE_CHECKING

from sinkwright.definitions.plan import AnyTest, CurrentLimit, Hold, LoadRegulation
from sinkwright.procedures import current_limit, hold, load_regulation, rest
from sinkwright.procedures.procedure import Step
from sinkwright.procedures.setpoint import SetPoint

if TYPE_CHECKING:
    from sinkwright.definitions.board import BoardFile
    from sinkwright.definitions.plan import Plan, SourceUnderTest

AMBIENT_degC = 25.0


@dataclass(frozen=True)
class Expectation:
    """One test as expected. Power and heat are None while the source's voltage is not stated."""

    kind: str
    current_A: float
    power_W: float | None
    charge_Ah: float
    duration_s: float
    heatsink_degC: float | None
    #: What is held, in words, where it is not simply a current.
    setpoint: str = ""

    def to_json(self) -> dict[str, str | float | None]:
        return {
            "kind": self.kind,
            "current_A": self.current_A,
            "power_W": self.power_W,
            "charge_Ah": self.charge_Ah,
            "duration_s": self.duration_s,
            "heatsink_degC": self.heatsink_degC,
        }

    def sentence(self) -> str:
        """For people: what this test draws, heats and takes."""
        if self.current_A == 0 and self.setpoint:
            return f"{self.kind}: {self.setpoint}, with a current that depends on the source"
        if self.current_A == 0:
            return f"{self.kind}: the load stays off for {spell_time(self.duration_s)}"
        power = f" ({self.power_W:.1f} W)" if self.power_W is not None else ""
        heat = f", heatsink to about {self.heatsink_degC:.0f} °C" if self.heatsink_degC is not None else ""
        taken = f"{self.charge_Ah:.3f} Ah" if self.charge_Ah >= 0.1 else f"{self.charge_Ah * 1000:.1f} mAh"
        length = f" in about {spell_time(self.duration_s)}" if self.duration_s else ", for an unknown time"
        held = f"{self.setpoint}, " if self.setpoint else ""
        return f"{self.kind}: {held}draws up to {self.current_A:.3f} A{power}, {taken}{length}{heat}"


def most_current(plan: Plan, board: BoardFile) -> float:
    """What the limits let flow, in A: a constant voltage may take all of it."""
    own = plan.limits.current_A
    return board.limits.current_A if own is None else min(own, board.limits.current_A)


def steps_of(test: AnyTest, source: SourceUnderTest, most_A: float) -> list[Step]:
    """The stretches of a test, in order; `most_A` is what the limits let flow."""
    if isinstance(test, LoadRegulation):
        return load_regulation.steps(test, source)
    if isinstance(test, CurrentLimit):
        return current_limit.steps(test, source)
    if isinstance(test, Hold):
        return hold.steps(test, source, most_A)
    return rest.steps(test)


def expect(plan: Plan, board: BoardFile) -> tuple[Expectation, ...]:
    """Every test of the plan, the heat of one carried into the next."""
    expectations = []
    rise_K = 0.0
    for test in plan.tests:
        steps = steps_of(test, plan.source, most_current(plan, board))
        voltage_V = plan.source.rated_voltage_V
        largest_A = max(step.current_A for step in steps)
        hottest_K, rise_K = _heat(steps, voltage_V or 0.0, board, rise_K)
        expectations.append(
            Expectation(
                kind=test.kind,
                current_A=largest_A,
                power_W=None if voltage_V is None else max(step.power_at(voltage_V) for step in steps),
                charge_Ah=sum(step.current_A * step.duration_s for step in steps) / 3600,
                duration_s=sum(step.duration_s for step in steps),
                heatsink_degC=None if voltage_V is None else AMBIENT_degC + hottest_K,
                setpoint=_held(test),
            )
        )
    return tuple(expectations)


def _held(test: AnyTest) -> str:
    """What a hold does, where that is more than a current."""
    if not isinstance(test, Hold) or test.current_A is not None:
        return ""
    return SetPoint.of(test).in_words


def _heat(steps: list[Step], voltage_V: float, board: BoardFile, rise_K: float) -> tuple[float, float]:
    """The heatsink's highest and last rise over the air: one pole, by the board file's values."""
    hottest_K = rise_K
    for step in steps:
        final_K = step.power_at(voltage_V) * board.heatsink.K_per_W
        share = 1 - math.exp(-step.duration_s / board.heatsink.time_constant_s)
        rise_K += (final_K - rise_K) * share
        hottest_K = max(hottest_K, rise_K)
    return hottest_K, rise_K


def spell_time(seconds: float) -> str:
    """A time as people say it."""
    if seconds < 90:
        return f"{seconds:.0f} s"
    if seconds < 5400:
        return f"{seconds / 60:.0f} min"
    return f"{seconds / 3600:.1f} h"
