"""Carries out plans on the fake load, for the tests beside this file."""

from __future__ import annotations

import asyncio
from collections.abc import Callable
from typing import Any

from sinkwright.definitions.board import BoardFile
from sinkwright.definitions.loading import load_board, parse_plan
from sinkwright.definitions.plan import Plan
from sinkwright.procedures.progress import Event, Progress
from sinkwright.procedures.runner import run_plan
from sinkwright.results import RunResult
from sinkwright.stopping import StopRequest
from tests.support.fake_instrument import FakeInstrument, FakeSource, FakeWriter

SOURCE = "[source]\nrated_voltage_V = 12.0\nrated_current_A = 2.0\n"


class Listening(Progress):
    """Keeps the events; `on_event` may react to one."""

    def __init__(self, on_event: Callable[[Event], None] | None = None) -> None:
        self.events: list[Event] = []
        self.asked: list[str] = []
        self._on_event = on_event

    def tell(self, event: Event) -> None:
        self.events.append(event)
        if self._on_event is not None:
            self._on_event(event)

    async def ask(self, instruction: str) -> None:
        self.asked.append(instruction)


class Run:
    """One plan on one fake load; `carry_out` returns the result, the rest is for looking at."""

    def __init__(self, text: str, source: FakeSource | None = None, **settings: Any) -> None:
        self.plan: Plan = parse_plan(text, "test-plan")
        self.board: BoardFile = load_board()
        self.instrument: Any = FakeInstrument(source or FakeSource(), **settings)
        self.writer: Any = FakeWriter()
        self.stop = StopRequest()
        self.progress = Listening()

    def carry_out(self) -> RunResult:
        return asyncio.run(
            run_plan(self.instrument, self.plan, self.board, self.writer, self.progress, self.stop)
        )

    def texts(self, kind: str) -> list[str]:
        return [text for _, event, text, _ in self.writer.events if event == kind]


def within(quantity: Any, expected: float) -> bool:
    """Whether the stated interval holds the true value."""
    return abs(quantity.value - expected) <= quantity.expanded_uncertainty
