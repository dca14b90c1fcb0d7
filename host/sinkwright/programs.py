"""Programs that the board follows by itself, and bursts of every conversion around a trigger.

Turns lists of set-points in SI units into the wire's pieces, and captured readings into volts and amperes. What a
board can follow (number of steps, shortest duration, limits) is the board's to refuse; which mode the values are
in is the set-point's that was given before. It must not know plans, records or screens.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from typing import Literal, cast

from sinkwright.errors import AskedTooMuch
from sinkwright.instrument import Instrument
from sinkwright.wire_units import to_integer
from sinkwright_wire import messages
from sinkwright_wire.layouts import MAX_STEPS
from sinkwright_wire.messages import ArmBurst, BurstReadings, GetBurst, LoadProgram
from sinkwright_wire.vocabulary import BurstTrigger, Mode, ReadingKind, Shape

#: What a piece of a program says of its length in one byte; the board refuses more than it has room for.
_MOST_STEPS = 255
_MOST_REPEATS = 0xFFFF
_UNITS = {
    Mode.CURRENT: (1_000_000, "A"),
    Mode.POWER: (1_000_000, "W"),
    Mode.RESISTANCE: (1_000, "ohm"),
    Mode.VOLTAGE: (1_000_000, "V"),
}
_TRIGGERS = {
    "now": BurstTrigger.NOW,
    "set-point": BurstTrigger.SETPOINT_CHANGE,
    "fault": BurstTrigger.FAULT,
}
_MICRO = 1e-6


@dataclass(frozen=True)
class ProgramStep:
    """Go to `value` (A, W, ohm or V, after the mode) and stay for `duration_s`.

    With `ramp` the value is reached evenly over the whole duration, from where the step before ended. With
    `trigger` the board's trigger output is high during this step.
    """

    value: float
    duration_s: float
    ramp: bool = False
    trigger: bool = False


@dataclass(frozen=True)
class Program:
    """Steps in order, `repeats` times over; 0 repeats until another end of the run is reached."""

    steps: tuple[ProgramStep, ...]
    repeats: int = 1

    @property
    def duration_s(self) -> float:
        """Nominal length; infinite when it repeats without end."""
        once_s = sum(step.duration_s for step in self.steps)
        return once_s * self.repeats if self.repeats else float("inf")


def pulses(
    low: float, high: float, *, low_s: float, high_s: float, repeats: int = 1, trigger: bool = True
) -> Program:
    """`low`, then `high`, over and over; the trigger output marks `high`."""
    return Program((ProgramStep(low, low_s), ProgramStep(high, high_s, trigger=trigger)), repeats)


def ramp(start: float, end: float, duration_s: float, *, hold_s: float = 1.0) -> Program:
    """`start` for `hold_s`, then evenly to `end` within `duration_s`."""
    return Program((ProgramStep(start, hold_s), ProgramStep(end, duration_s, ramp=True, trigger=True)))


def listed(points: Iterable[tuple[float, float]], repeats: int = 1) -> Program:
    """One step for each (value, duration in seconds)."""
    return Program(tuple(ProgramStep(value, duration_s) for value, duration_s in points), repeats)


async def load_program(instrument: Instrument, program: Program, mode: Mode = Mode.CURRENT) -> None:
    """Hand `program` over, its values in the unit of `mode`; the load follows it once it is turned on with it.

    Raises AskedTooMuch for what cannot be said on the wire, and BoardRefused with the number of the step (from 0) for
    what the board cannot follow.
    """
    steps = _on_the_wire(program, mode)
    for first in range(0, len(steps), MAX_STEPS):
        piece = steps[first : first + MAX_STEPS]
        await instrument.link.request(LoadProgram(first, len(steps), program.repeats, piece))


def _on_the_wire(program: Program, mode: Mode) -> tuple[messages.ProgramStep, ...]:
    if not 1 <= len(program.steps) <= _MOST_STEPS:
        raise _refused(
            f"a program of {len(program.steps)} steps is none that a board can be given", "Give 1 to 100."
        )
    if not 0 <= program.repeats <= _MOST_REPEATS:
        raise _refused(
            f"a program cannot be repeated {program.repeats} times",
            f"Give 1 to {_MOST_REPEATS}, or 0 to go on until another end.",
        )
    parts, unit = _UNITS[mode]
    return tuple(
        messages.ProgramStep(
            to_integer(step.duration_s, 1000, f"the duration of step {number}", "s"),
            to_integer(step.value, parts, f"the value of step {number}", unit),
            Shape.RAMP if step.ramp else Shape.STEP,
            step.trigger,
        )
        for number, step in enumerate(program.steps)
    )


def _refused(what: str, remedy: str) -> AskedTooMuch:
    return AskedTooMuch(what[0].upper() + what[1:], load="Nothing was sent to the load.", remedy=remedy)


@dataclass(frozen=True)
class BurstPoint:
    """One conversion: when it began, in seconds after the trigger (negative: before), and what it gave, in V, A
    or degC after its kind."""

    time_s: float
    kind: ReadingKind
    value: float


@dataclass(frozen=True)
class Burst:
    """Every conversion around a trigger, one each `interval_s`. `trigger_us` is on the board's clock."""

    points: tuple[BurstPoint, ...]
    trigger_us: int
    interval_s: float

    def of(self, kind: ReadingKind) -> list[tuple[float, float]]:
        """(seconds after the trigger, value) of every reading of one kind."""
        return [(point.time_s, point.value) for point in self.points if point.kind == kind]

    @property
    def voltages(self) -> list[tuple[float, float]]:
        """(s, V) at the sense leads."""
        return self.of(ReadingKind.VOLTAGE)

    @property
    def currents(self) -> list[tuple[float, float]]:
        """(s, A), the current zero taken off."""
        return self.of(ReadingKind.CURRENT)


async def arm_burst(
    instrument: Instrument, trigger: Literal["now", "set-point", "fault"] = "now", *, before: int = 0
) -> None:
    """Capture every conversion around `trigger`, the last `before` readings before it included.

    "set-point" is the next change of the set-point, turning on and off included; "fault" is the next fault. An
    earlier capture is given up.
    """
    await instrument.link.request(ArmBurst(before, _TRIGGERS[trigger]))


async def fetch_burst(instrument: Instrument) -> Burst | None:
    """The burst, or None while it is not complete."""
    readings: list[messages.BurstReading] = []
    while True:
        part = cast(BurstReadings, await instrument.link.request(GetBurst(len(readings))))
        if not part.total:
            return None
        readings += part.readings
        if not part.readings or len(readings) >= part.total:
            return _burst(readings, part)


def _burst(readings: list[messages.BurstReading], part: BurstReadings) -> Burst:
    interval_s = part.step_us * _MICRO
    return Burst(
        tuple(
            BurstPoint((number - part.before) * interval_s, reading.kind, _in_si(reading))
            for number, reading in enumerate(readings)
        ),
        part.started_us + part.before * part.step_us,
        interval_s,
    )


def _in_si(reading: messages.BurstReading) -> float:
    return reading.value / (1_000 if reading.kind == ReadingKind.HEATSINK else 1_000_000)
