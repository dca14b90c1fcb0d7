"""How a run looks in a terminal, in a log file, and as JSON lines; and how its results read.

Progress goes to stderr and results to stdout, so that a script reads results alone. On a terminal one line is
redrawn; elsewhere lines are sparse. It decides nothing about what is measured.
"""

from __future__ import annotations

import asyncio
import json
import os
import select
import sys
import time
from typing import TYPE_CHECKING, Any

import click

from sinkwright.errors import SinkwrightError
from sinkwright.procedures.progress import (
    Doing,
    Event,
    Progress,
    Reading,
    RunBegins,
    TestBegins,
    TestEnds,
    Warned,
)
from sinkwright.results import Quantity, RunResult, TestResult

if TYPE_CHECKING:
    from sinkwright.procedures.job import Done

REDRAW_s = 0.1
#: Where nothing can be redrawn: between two sentences, and between two signs of life.
SPARSE_s = 5.0
STILL_HERE_s = 60.0
BAR_WIDTH = 20
_VERDICT_COLOURS = {"pass": "green", "fail": "red", "inconclusive": "yellow", "none": None}
VERDICT_WORDS = {
    "pass": "PASS",
    "fail": "FAIL",
    "inconclusive": "INCONCLUSIVE",
    "none": "measured, no bounds given",
}


class Asking(Progress):
    """Asks a person at the keyboard; stays stoppable while it waits."""

    simulated = False

    async def ask(self, instruction: str) -> None:
        if self.simulated:
            click.echo(f"  (simulated, nobody has to do it) {instruction}", err=True)
            return
        click.echo(f"  {instruction}\n  Press Enter when that is done.", err=True)
        while not _line_waits():
            await asyncio.sleep(0.1)
        if not sys.stdin.readline():
            raise SinkwrightError(
                f"nobody is there to do what the plan asks: {instruction}",
                load="The load is off.",
                remedy="Run this plan at a terminal, or take the instruction out of it.",
            )


def _line_waits() -> bool:
    # Windows cannot select on a console: there the read itself waits, and Ctrl-C ends it.
    if os.name == "nt":
        return True
    return bool(select.select([sys.stdin], [], [], 0)[0])


class TextProgress(Asking):
    """For people: one redrawn line on a terminal, sparse lines elsewhere."""

    def __init__(self) -> None:
        self._redraws = sys.stderr.isatty()
        self._tests = 0
        self._label = ""
        self._doing = ""
        self._shown_s = time.monotonic()
        self._drawn = False

    def tell(self, event: Event) -> None:
        if isinstance(event, Reading):
            self._draw(event)
        elif isinstance(event, Doing):
            if not self._redraws and (not self._doing or self._is_quiet_for(SPARSE_s)):
                self._line(f"  {event.sentence}")
            self._doing = event.sentence
        elif isinstance(event, RunBegins):
            self.simulated = event.simulated
            self._tests = event.tests
            self._line(begin_words(event))
        elif isinstance(event, Warned):
            self._line(f"  Note: {event.sentence}")
        elif isinstance(event, TestBegins):
            self._doing = ""
            self._label = f"{event.number}/{self._tests} {event.kind}"
            self._line(f"{self._label} ...")
        elif isinstance(event, TestEnds):
            self._line(f"{self._label}: {VERDICT_WORDS[event.result.verdict]}")

    def _draw(self, reading: Reading) -> None:
        if not self._redraws:
            if self._is_quiet_for(STILL_HERE_s):
                self._line(f"  {reading.fraction * 100:.0f} %, {_figures(reading)}")
            return
        if not self._is_quiet_for(REDRAW_s):
            return
        self._shown_s = time.monotonic()
        full = round(reading.fraction * BAR_WIDTH)
        bar = "#" * full + "." * (BAR_WIDTH - full)
        mark = "SIMULATED " if self.simulated else ""
        text = f"  {mark}[{bar}] {reading.fraction * 100:3.0f} %  {_figures(reading)}  {self._doing}"
        width = os.get_terminal_size(sys.stderr.fileno()).columns
        click.echo("\r\x1b[K" + text[: width - 1], err=True, nl=False)
        self._drawn = True

    def _is_quiet_for(self, seconds: float) -> bool:
        return time.monotonic() - self._shown_s >= seconds

    def _line(self, text: str) -> None:
        if self._drawn:
            click.echo("\r\x1b[K", err=True, nl=False)
            self._drawn = False
        click.echo(text, err=True)
        self._shown_s = time.monotonic()


def _figures(reading: Reading) -> str:
    return f"{reading.voltage_V:7.3f} V {reading.current_A:6.3f} A {reading.heatsink_degC:3.0f} °C"


class LineProgress(Asking):
    """For programs: one JSON object a line on stdout."""

    def tell(self, event: Event) -> None:
        if isinstance(event, RunBegins):
            self.simulated = event.simulated
        print_json(event.to_json())


class SilentProgress(Asking):
    """For `--json` alone: only what must be asked of a person is shown, on stderr."""

    def tell(self, event: Event) -> None:
        if isinstance(event, RunBegins):
            self.simulated = event.simulated


def begin_words(event: RunBegins) -> str:
    """What is about to happen, for people."""
    from sinkwright.procedures.expectation import spell_time

    kind = "SIMULATED board" if event.simulated else "board"
    tests = "1 test" if event.tests == 1 else f"{event.tests} tests"
    length = f", about {spell_time(event.expected_s)} on the board's clock" if event.expected_s else ""
    return f"Plan {event.plan} on the {kind} {event.board}: {tests}{length}."


def print_json(data: dict[str, Any]) -> None:
    """One JSON object on one line of stdout."""
    click.echo(json.dumps(data, ensure_ascii=False))


def tell_results(result: RunResult) -> None:
    """The results of a run for people, on stdout."""
    mark = "SIMULATED: nothing here was measured on a real source. " if result.simulated else ""
    click.echo()
    click.echo(f"{mark}Verdict over all: {_coloured(result.verdict)}")
    for number, test in enumerate(result.tests, start=1):
        _tell_test(number, test)


def tell_files(done: Done) -> None:
    """Where a run's record and report lie, on stdout."""
    click.echo()
    click.echo(f"Record: {done.record}")
    if done.report is not None:
        click.echo(f"Report: {done.report}")


def _tell_test(number: int, test: TestResult) -> None:
    click.echo()
    stopped = f" (ended by {test.stopped_by})" if test.stopped_by else ""
    click.echo(f"{number}. {test.kind}: {_coloured(test.verdict)}{stopped}")
    for quantity in test.quantities.values():
        for line in quantity_lines(quantity):
            click.echo(f"   {line}")
    for note in test.notes:
        click.echo(f"   Note: {note}")


def quantity_lines(quantity: Quantity) -> list[str]:
    """One quantity as sentences: value with uncertainty, bounds, verdict, reason and remedy."""
    from sinkwright.units import QUANTITIES, format_value

    label = QUANTITIES[quantity.name].label
    if quantity.value is None:
        value = "not found"
    else:
        value = format_value(quantity.value, quantity.expanded_uncertainty, quantity.unit)
    bounds = _bounds(quantity)
    verdict = f": {_coloured(quantity.verdict)}" if quantity.verdict != "none" else ""
    lines = [f"{label}: {value}{bounds}{verdict}"]
    if quantity.reason and (quantity.verdict != "none" or quantity.value is None):
        lines.append(f"  {quantity.reason}")
    if quantity.remedy and quantity.verdict == "inconclusive":
        lines.append(f"  {quantity.remedy}")
    return lines


def _bounds(quantity: Quantity) -> str:
    if quantity.min is None and quantity.max is None:
        return ""
    if quantity.min is None:
        return f", at most {quantity.max:g} {quantity.unit}"
    if quantity.max is None:
        return f", at least {quantity.min:g} {quantity.unit}"
    return f", wanted {quantity.min:g} to {quantity.max:g} {quantity.unit}"


def _coloured(verdict: str) -> str:
    return click.style(VERDICT_WORDS[verdict], fg=_VERDICT_COLOURS[verdict], bold=True)
