"""Measures every row and writes the table: for the page in host/docs, and for whoever looks at CI's output."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

from . import rows_of_the_circuit, rows_of_the_firmware, rows_of_the_host
from .children import run_cases, run_script
from .rows import Found, Outcome, Row, judge

PAGE = Path(__file__).resolve().parents[3] / "host" / "docs" / "faults.md"
BEGIN, END = "<!-- fault table: begin -->", "<!-- fault table: end -->"
ROWS: tuple[Row, ...] = (*rows_of_the_circuit.ROWS, *rows_of_the_host.ROWS, *rows_of_the_firmware.ROWS)
_HEAD = (
    "| fault | detected as | after (control periods) | bound | gate clamped after | largest current | outcome |",
    "|---|---|---|---|---|---|---|",
)


def measure() -> list[tuple[Row, Found]]:
    """Every row with the worst that its runs showed. The rows' raw findings decide nothing else."""
    cases = [row.cases() for row in ROWS]
    findings = iter(run_cases([case for of_row in cases for case in of_row]))
    measured: list[tuple[Row, Found]] = []
    for row, of_row in zip(ROWS, cases, strict=True):
        found: list[dict[str, Any]] = [next(findings) for _ in of_row]
        measured.append((row, judge(row, of_row, found)))
        if row.key == rows_of_the_firmware.EVERY_FUNCTION:
            rows_of_the_firmware.check_reached(of_row, found)
    return [*measured, (rows_of_the_firmware.POWER_CUT, _power_cut())]


def _power_cut() -> Found:
    found = json.loads(run_script("power_cut.py"))
    outcome = Outcome.HARMFUL if found["lost"] else Outcome.SAFE
    return Found(rows_of_the_firmware.CHECK_SUM, 0, None, 0.0, outcome)


def lines(measured: list[tuple[Row, Found]]) -> list[str]:
    return [*_HEAD, *(_line(row, found) for row, found in measured)]


def _line(row: Row, found: Found) -> str:
    cells = (
        row.fault,
        found.detected_as,
        "-" if found.periods is None else str(found.periods),
        str(row.bound),
        "was clamped" if found.clamped is None else str(found.clamped),
        f"{found.peak_A:.1f} A",
        found.outcome.value,
    )
    return "| " + " | ".join(cells) + " |"


def facts(table: list[str]) -> list[tuple[str, str, str]]:
    """(fault, detected as, outcome) of each row of a written table."""
    rows = [
        [cell.strip() for cell in line.strip("|").split(" | ")] for line in table if line.startswith("| ")
    ]
    return [(row[0], row[1], row[-1]) for row in rows[1:]]


def page_lines() -> list[str]:
    """The table as it stands on the page."""
    text = PAGE.read_text(encoding="utf-8")
    return text.split(BEGIN)[1].split(END)[0].strip().splitlines()


def write_page(table: list[str]) -> None:
    before, rest = PAGE.read_text(encoding="utf-8").split(BEGIN)
    after = rest.split(END)[1]
    PAGE.write_text("".join([before, BEGIN, "\n", "\n".join(table), "\n", END, after]), encoding="utf-8")
