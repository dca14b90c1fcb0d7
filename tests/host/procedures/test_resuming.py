"""A record whose program was gone is made whole from what the board kept; whatever does not fit is refused."""

from __future__ import annotations

import asyncio
import dataclasses
import json
import sqlite3
from pathlib import Path
from types import SimpleNamespace
from typing import Any

import pytest

from sinkwright.board_run import BoardRun
from sinkwright.definitions.loading import load_board
from sinkwright.errors import SinkwrightError
from sinkwright.procedures.resuming import Resumed, resume
from sinkwright.readings import FaultDescription, RunLog
from sinkwright.records import RecordWriter, open_record
from sinkwright.records.schema import BOARD_LOG
from sinkwright_wire.messages import LogEntry
from sinkwright_wire.vocabulary import Fault, RunEnd, State
from tests.host.records.made_up import BOOT_us, header, hold, samples

PLAN = """\
when_host_silent = "continue"
[source]
rated_voltage_V = 12.0
[[test]]
kind = "hold"
current_A = 2.0
end_voltage_V = 11.0
duration_s = 3600.0
accept.capacity_Ah = { min = 0.1 }
"""
SECOND = '[[test]]\nkind = "rest"\nduration_s = 10.0\n'
RUN = 0x1234ABCD
SEEN_s, LASTED_s = 10, 600


class Board:
    """What a board keeps of ten minutes at 2 A, an entry every second; and what it is asked."""

    def __init__(self, **changes: Any) -> None:
        run = BoardRun(
            RUN, State.ENDED, RunEnd.VOLTAGE, False, True, BOOT_us, BOOT_us + LASTED_s * 1_000_000,
            2_000_000 * LASTED_s, 24_000_000 * LASTED_s, LASTED_s,
        )  # fmt: skip
        self.run = dataclasses.replace(run, **changes)
        self.identity = SimpleNamespace(name="perfboard-4A")
        self.fault_now: FaultDescription | None = None
        self.fetched: list[int] = []

    async def board_run(self) -> BoardRun:
        return self.run

    async def status(self) -> Any:
        return SimpleNamespace(in_words="The load sinks 2.000 A at 11.500 V.")

    async def fault(self) -> FaultDescription | None:
        return self.fault_now

    async def log(self) -> RunLog:
        entries = [
            LogEntry(
                s * 1000,
                12_000_000 - 1000 * s,
                11_990_000 - 1000 * s,
                12_010_000,
                2_000_000,
                3000 + s,
                2000 * s,
            )
            for s in range(1, LASTED_s + 1)
        ]
        return RunLog(1.0, tuple(entries))

    async def mark_fetched(self, run: int) -> None:
        self.fetched.append(run)


def record_in(
    folder: Path, plan: str = PLAN, run: int = RUN, name: str = "cut.sqlite", test: int = 1
) -> Path:
    """A record whose program was killed ten seconds into its run."""
    path = folder / name
    with RecordWriter.create(path, header(plan_text=plan, board_file=load_board().text)) as writer:
        if test == 2:
            writer.add_result(hold())
        writer.add_event(0, "board-run", "A run begins.", {"run": run, "test": test, "alone": True})
        writer.add_samples(samples([2.0] * SEEN_s * 10))
    return path


def resumed(board: Board, folder: Path, path: Path | None = None) -> Resumed:
    return asyncio.run(resume(board, folder, path))  # pyright: ignore[reportArgumentType]


def test_the_record_that_names_the_run_is_found_and_made_whole(tmp_path: Path) -> None:
    record_in(tmp_path, run=77, name="another.sqlite")
    path = record_in(tmp_path)
    (tmp_path / "rubbish.sqlite").write_text("no record")
    board = Board()

    done = resumed(board, tmp_path)

    assert done.record == path
    assert done.report.is_file()
    assert board.fetched == [RUN]
    (test,) = done.result.tests
    assert (test.stopped_by, test.verdict) == ("end_voltage_V", "pass")
    assert test.quantities["capacity_Ah"].value == pytest.approx(2.0 * LASTED_s / 3600, rel=0.001)
    assert test.quantities["energy_Wh"].value == pytest.approx(24.0 * LASTED_s / 3600, rel=0.001)
    assert test.quantities["duration_s"].value == pytest.approx(LASTED_s)
    # The mean of the last minute: an entry every second, falling by 1 mV each.
    assert test.quantities["voltage_V"].value == pytest.approx(12.0 - 0.570, abs=0.002)
    with open_record(path) as record:
        assert (record.state, record.verdict) == ("complete", "pass")
        assert record.run_result() == done.result
        assert record.events()[-1].kind == "resumed"


def test_the_stretch_that_was_missed_is_marked_and_the_samples_are_untouched(tmp_path: Path) -> None:
    path = record_in(tmp_path)
    with open_record(path) as record:
        before = list(record.samples())
    done = resumed(Board(), tmp_path)
    with open_record(path) as record:
        assert list(record.samples()) == before
        log = record.board_log()
        envelope = record.envelope(600)
        extremes = record.extremes()
    assert len(log) == LASTED_s
    assert [entry.missed for entry in log] == [0] * (SEEN_s - 1) + [1] * (LASTED_s - SEEN_s + 1)
    assert done.entries == LASTED_s - SEEN_s + 1
    assert envelope[-1].charge_C == pytest.approx(2.0 * LASTED_s)
    assert extremes is not None
    assert extremes.count == SEEN_s * 10
    assert extremes.voltage_min_V.value == pytest.approx(11.39)
    page = done.report.read_text(encoding="utf-8")
    assert "Kept by the board alone" in page
    assert "kept by the board, every 1 s" in page


def test_resuming_again_changes_nothing(tmp_path: Path) -> None:
    first = resumed(Board(), record_in(tmp_path).parent)
    again = resumed(Board(fetched=True), tmp_path)
    assert again.result == first.result
    assert again.words == "The record was whole already."


def test_a_run_that_goes_on_is_left_alone(tmp_path: Path) -> None:
    record_in(tmp_path)
    board = Board(state=State.SINKING)
    with pytest.raises(SinkwrightError, match="still goes on") as caught:
        resumed(board, tmp_path)
    assert "sinks 2.000 A" in str(caught.value)
    assert board.fetched == []


def test_a_board_that_keeps_no_run_says_so(tmp_path: Path) -> None:
    with pytest.raises(SinkwrightError, match="keeps no run"):
        resumed(Board(run=0, started_us=0), tmp_path)


def test_a_run_that_no_record_names_stays_on_the_board(tmp_path: Path) -> None:
    record_in(tmp_path, run=77)
    board = Board()
    with pytest.raises(SinkwrightError, match="no record names the run 1234ABCD"):
        resumed(board, tmp_path)
    with pytest.raises(SinkwrightError, match="no record names the run"):
        resumed(board, tmp_path / "missing")
    assert board.fetched == []


def test_a_record_of_another_run_is_not_mixed_with_it(tmp_path: Path) -> None:
    path = record_in(tmp_path, run=77)
    with pytest.raises(SinkwrightError, match="of another run"):
        resumed(Board(), tmp_path, path)
    with open_record(path) as record:
        assert (record.state, record.board_log()) == ("open", [])


def test_a_protection_that_stopped_the_run_is_the_result(tmp_path: Path) -> None:
    path = record_in(tmp_path)
    board = Board(state=State.FAULT, ended_by=RunEnd.FAULT)
    board.fault_now = FaultDescription(Fault.HEATSINK_HOT, "Too hot.", 86.0, 85.0, "°C", False, 0)
    (test,) = resumed(board, tmp_path).result.tests
    assert (test.stopped_by, test.verdict) == ("heatsink-hot", "inconclusive")
    with open_record(path) as record:
        assert record.state == "fault"


def test_a_run_that_somebody_turned_off_is_not_complete(tmp_path: Path) -> None:
    path = record_in(tmp_path)
    (test,) = resumed(Board(state=State.OFF, ended_by=RunEnd.DISABLED), tmp_path).result.tests
    assert test.stopped_by == "turned-off"
    with open_record(path) as record:
        assert record.state == "interrupted"


def test_tests_that_were_never_begun_are_named(tmp_path: Path) -> None:
    path = record_in(tmp_path, PLAN + SECOND)
    (test,) = resumed(Board(), tmp_path).result.tests
    assert "rest: not carried out, because the run stopped before it." in test.not_tested
    with open_record(path) as record:
        assert record.state == "lost"


def test_the_results_of_earlier_tests_are_kept(tmp_path: Path) -> None:
    two = PLAN + PLAN[PLAN.index("[[test]]") :]
    path = record_in(tmp_path, two, test=2)
    result = resumed(Board(), tmp_path).result
    assert [test.kind for test in result.tests] == ["hold", "hold"]
    assert result.tests[0] == hold()
    with open_record(path) as record:
        assert record.results() == list(result.tests)


def test_the_result_of_a_lost_link_is_replaced(tmp_path: Path) -> None:
    path = record_in(tmp_path)
    connection = sqlite3.connect(path)
    connection.execute("INSERT INTO result VALUES (1, ?)", (json.dumps(hold().to_json()),))
    connection.execute("UPDATE run SET value = 'lost' WHERE key = 'state'")
    connection.commit()
    connection.close()
    resumed(Board(), tmp_path)
    with open_record(path) as record:
        assert [result.stopped_by for result in record.results()] == ["end_voltage_V"]


def test_a_record_of_version_1_is_brought_up_to_date(tmp_path: Path) -> None:
    path = record_in(tmp_path)
    connection = sqlite3.connect(path)
    connection.execute(f"DROP TABLE {BOARD_LOG.name}")
    connection.execute("PRAGMA user_version = 1")
    connection.close()
    resumed(Board(), tmp_path)
    with open_record(path) as record:
        assert record.version == 2
        assert len(record.board_log()) == LASTED_s
