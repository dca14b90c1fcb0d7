"""The fault table: every row of it is there, holds its bound, and stands on its page as measured."""

from __future__ import annotations

import os
from pathlib import Path

import pytest

from . import table
from .rows import Found, Row

#: What must be brought about, in the words of the demand; a row's key begins with them.
DEMANDED = (
    "bus stuck low",
    "adc missing at boot",
    "dac missing at boot",
    "adc missing in a run",
    "dac missing in a run",
    "adc not converting",
    "adc bit 15 stuck",
    "dac stuck",
    "thermistor open",
    "thermistor shorted",
    "thermistor loose",
    "fan dead",
    "host killed",
    "garbage",
    "unread",
    "exception in every module",
    "ctrl-c at each bus call",
    "power cut at every octet",
    "clock wraps",
    "loop starved",
    "watchdog",
    "sense open",
    "sense swapped",
    "sense resistor open",
    "sense resistor shorted",
    "clamp ineffective",
    "source reversed",
    "source too high",
    "source disconnected",
    "transistor shorted",
)


@pytest.fixture(scope="module")
def measured(tmp_path_factory: pytest.TempPathFactory) -> list[tuple[Row, Found]]:
    found = table.measure()
    written = "\n".join(table.lines(found)) + "\n"
    # CI prints this file; by hand it stands in the test's own folder.
    folder = Path(os.environ.get("FAULT_TABLE_DIR") or tmp_path_factory.mktemp("faults"))
    (folder / "fault_table.md").write_text(written, encoding="utf-8")
    return found


@pytest.mark.timeout(900)
def test_every_fault_is_detected_within_its_bound_and_ends_as_its_row_says(
    measured: list[tuple[Row, Found]],
) -> None:
    lacking = [f"{row.fault}: {what}" for row, found in measured for what in found.shortfalls(row)]
    assert not lacking, "\n".join(lacking)


def test_no_fault_that_must_be_brought_about_is_missing(measured: list[tuple[Row, Found]]) -> None:
    assert set(DEMANDED) - {row.key for row, _ in measured} == set()


def test_the_page_shows_the_rows_and_outcomes_that_were_measured(measured: list[tuple[Row, Found]]) -> None:
    """After a change: `python -m tests.system.fault_table` writes the page anew."""
    assert table.facts(table.page_lines()) == table.facts(table.lines(measured))
