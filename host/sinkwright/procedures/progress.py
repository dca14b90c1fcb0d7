"""What a run tells while it goes on, as plain events: terminal, panel or JSON lines show them.

Decides which events there are; knows neither screen nor device. Whoever shows a run subclasses `Progress`.
"""

from __future__ import annotations

from dataclasses import asdict, dataclass
from typing import Any, ClassVar

from sinkwright.results import TestResult


@dataclass(frozen=True)
class Event:
    """One thing that happened; `to_json` is one line of `run --events`."""

    name: ClassVar[str] = "event"

    def to_json(self) -> dict[str, Any]:
        return {"event": self.name, **asdict(self)}


@dataclass(frozen=True)
class RunBegins(Event):
    """The plan is accepted and the board answers; it should take `expected_s` on the board's clock."""

    name = "run-begins"
    plan: str
    board: str
    simulated: bool
    tests: int
    expected_s: float
    record: str


@dataclass(frozen=True)
class TestBegins(Event):
    """A test of the plan begins; `number` counts from 1."""

    __test__ = False  # pytest would otherwise take the name for a test class

    name = "test-begins"
    number: int
    kind: str
    expected_s: float


@dataclass(frozen=True)
class Doing(Event):
    """What the load is doing now, in one sentence."""

    name = "doing"
    sentence: str


@dataclass(frozen=True)
class Reading(Event):
    """One telemetry frame, and how far the test has come (0 to 1)."""

    name = "reading"
    time_us: int
    voltage_V: float
    current_A: float
    heatsink_degC: float
    fraction: float


@dataclass(frozen=True)
class Warned(Event):
    """Something the person should know that does not stop the run."""

    name = "warning"
    sentence: str


@dataclass(frozen=True)
class TestEnds(Event):
    """A test is done, or stopped; its result is what the record keeps."""

    __test__ = False

    name = "test-ends"
    number: int
    result: TestResult

    def to_json(self) -> dict[str, Any]:
        return {"event": self.name, "number": self.number, "result": self.result.to_json()}


@dataclass(frozen=True)
class Kept(Event):
    """Where the run's record lies, and its report if one could be written."""

    name = "kept"
    record: str
    report: str | None


class Progress:
    """Where a run's events go. This one shows nothing, and goes on at once when a person is asked for."""

    #: Whether the load has been told to sink; kept up to date by the bench, for whoever must not pause
    #: meanwhile.
    sinking = False
    #: Where record and report lie, once the run is over however it ended.
    kept: Kept | None = None

    def tell(self, event: Event) -> None:
        """Show one event."""

    async def ask(self, instruction: str) -> None:
        """Show an instruction of the plan and return when the person says that it is done."""
