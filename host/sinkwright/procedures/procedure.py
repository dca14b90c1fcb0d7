"""The shape that every kind of test has: carry it out on a bench, then conclude from whatever was measured.

`conclude` works on a test that was stopped half-way as well: what could not be found says why. This file
knows neither the kinds nor how readings are taken.
"""

from __future__ import annotations

from abc import ABC, abstractmethod
from dataclasses import dataclass, field
from typing import TYPE_CHECKING, ClassVar, Generic, TypeVar

from sinkwright.definitions.plan import Test
from sinkwright.procedures.endings import DERATED, Stopped, is_planned
from sinkwright.results import Quantity, TestResult, Verdict, overall
from sinkwright.uncertainty.causes import Cause, Uncertain
from sinkwright.uncertainty.verdict import judge

if TYPE_CHECKING:
    from sinkwright.definitions.plan import SourceUnderTest
    from sinkwright.procedures.bench import Bench
    from sinkwright.procedures.setpoint import SetPoint


NOT_REACHED = "The test ended before this was measured."
#: Between the board's microsecond and the second: a crystal of 50 ppm with its ageing (from memory).
CLOCK_SHARE = 1e-4

TestT = TypeVar("TestT", bound=Test)


@dataclass(frozen=True)
class Step:
    """One stretch of a test as expected: what is drawn, and for how long. Zero: the gate clamped."""

    current_A: float
    duration_s: float
    #: What is held, where it is not this current.
    setpoint: SetPoint | None = None

    def power_at(self, voltage_V: float) -> float:
        """What it turns into heat at a source's voltage, in W."""
        if self.setpoint is None:
            return voltage_V * self.current_A
        return self.setpoint.power_at(voltage_V, self.current_A)


@dataclass(frozen=True)
class Found:
    """A quantity as a procedure found it: a value, or the reason why there is none."""

    value: Uncertain | None
    missing: str = ""
    #: A reason why no verdict can be given although there is a value (leads whose resistance is not known).
    unresolved: str = ""


@dataclass
class Procedure(ABC, Generic[TestT]):
    """One test being carried out. Subclasses set `kind` and `not_tested`, and fill `notes` and `points`."""

    kind: ClassVar[str] = ""
    not_tested: ClassVar[tuple[str, ...]] = ()

    bench: Bench
    test: TestT
    notes: list[str] = field(default_factory=list)
    points: list[dict[str, float]] = field(default_factory=list)
    stopped_by: str | None = None

    @abstractmethod
    async def carry_out(self) -> None:
        """Draw, wait and read. Raises Stopped (a fault, derating, an interruption) and LinkLost."""

    @abstractmethod
    def found(self) -> dict[str, Found]:
        """The quantities of this kind from what was measured so far."""

    @property
    def source(self) -> SourceUnderTest:
        return self.bench.plan.source

    def conclude(self, stopped: Stopped | None, started_us: int, ended_us: int) -> TestResult:
        """The test's result; `stopped` tells of an end that the plan did not ask for."""
        stopped_by = stopped.stopped_by if stopped else self.stopped_by
        quantities = {name: self._judged(name, found, stopped) for name, found in self.found().items()}
        notes = (*self.notes, stopped.sentence) if stopped else tuple(self.notes)
        return TestResult(
            kind=self.kind,
            verdict=_verdict(quantities, stopped_by),
            quantities=quantities,
            stopped_by=stopped_by,
            notes=notes,
            not_tested=self.not_tested,
            started_us=started_us,
            ended_us=ended_us,
            points=tuple(self.points),
        )

    def _judged(self, name: str, found: Found, stopped: Stopped | None) -> Quantity:
        bounds = self.test.accept.get(name)
        unresolved = found.unresolved
        if stopped and stopped.stopped_by == DERATED:
            # A derated load drew less than the plan asked for (design: such a result is inconclusive).
            unresolved = stopped.sentence
        return judge(
            name,
            found.value,
            minimum=bounds.min if bounds else None,
            maximum=bounds.max if bounds else None,
            decision=self.bench.plan.decision,
            reason_if_none=stopped.sentence if stopped else found.missing,
            unresolved=unresolved,
        )


def _verdict(quantities: dict[str, Quantity], stopped_by: str | None) -> Verdict:
    """A test that was stopped cannot pass: what it did not reach might have failed."""
    verdict = overall(tuple(q.verdict for q in quantities.values()))
    if not is_planned(stopped_by) and verdict != "fail":
        return "inconclusive"
    return verdict


def board_clock() -> Uncertain:
    """One second by the board's clock, in s."""
    return Uncertain(1.0, {Cause("the board's clock", "rectangular", CLOCK_SHARE): 1.0})
