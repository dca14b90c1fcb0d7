"""How a run reads on a terminal."""

from __future__ import annotations

import asyncio
import os

import click
import pytest

from sinkwright.cli.output import SilentProgress, TextProgress, quantity_lines
from sinkwright.errors import SinkwrightError
from sinkwright.procedures.progress import Doing, Reading, RunBegins, TestBegins
from sinkwright.results import Quantity

BEGIN = RunBegins("plan", "bench-1", True, 2, 30.0, "record.sqlite")


def test_an_inconclusive_quantity_gives_its_reason_and_its_remedy():
    quantity = Quantity(
        "no_load_voltage_V",
        12.0521,
        "V",
        0.0371,
        1.8,
        11.9,
        12.06,
        "inconclusive",
        "It crosses.",
        "Calibrate.",
    )
    assert [click.unstyle(line) for line in quantity_lines(quantity)] == [
        "No-load voltage: 12.052 V ± 0.037 V, wanted 11.9 to 12.06 V: INCONCLUSIVE",
        "  It crosses.",
        "  Calibrate.",
    ]


def test_a_quantity_that_was_not_found_says_why():
    quantity = Quantity("current_limit_A", None, "A", None, reason="No limit was found up to 3.000 A.")
    assert quantity_lines(quantity) == ["Current limit: not found", "  No limit was found up to 3.000 A."]


def test_where_nothing_can_be_redrawn_the_first_sentence_of_a_test_is_shown_and_then_few(capsys):
    progress = TextProgress()
    for event in (
        BEGIN,
        TestBegins(1, "current-limit", 10.0),
        Doing("The load sinks 0.500 A."),
        Doing("The load sinks 1.000 A."),
        Reading(0, 12.0, 1.0, 30.0, 0.5),
    ):
        progress.tell(event)
    told = capsys.readouterr()
    assert told.out == ""
    assert told.err.splitlines() == [
        "Plan plan on the SIMULATED board bench-1: 2 tests, about 30 s on the board's clock.",
        "1/2 current-limit ...",
        "  The load sinks 0.500 A.",
    ]


@pytest.fixture
def keyboard(monkeypatch):
    """A pipe in place of the keyboard; returns its writing end."""
    reading, writing = os.pipe()
    with open(reading) as stdin:  # noqa: PTH123  a descriptor is no path
        monkeypatch.setattr("sys.stdin", stdin)
        yield writing


def test_an_instruction_waits_for_enter(keyboard, capsys):
    os.write(keyboard, b"\n")
    asyncio.run(SilentProgress().ask("Turn the knob to 12 V."))
    assert "Turn the knob to 12 V." in capsys.readouterr().err
    os.close(keyboard)


def test_an_instruction_that_nobody_answers_is_an_error(keyboard):
    os.close(keyboard)
    with pytest.raises(SinkwrightError, match="nobody is there"):
        asyncio.run(SilentProgress().ask("Turn the knob to 12 V."))
