"""A plan from file to report, and the state in which its record is closed."""

from __future__ import annotations

import asyncio

import pytest

from sinkwright.board_run import BoardRun
from sinkwright.definitions.loading import load_board, parse_board, parse_plan
from sinkwright.errors import SinkwrightError
from sinkwright.instrument import Instrument
from sinkwright.procedures.job import Job, carry_out
from sinkwright.procedures.progress import Warned
from sinkwright.records import open_record
from sinkwright.stopping import StopRequest
from sinkwright_wire.vocabulary import RunEnd, State
from tests.host.procedures.carrying_out import SOURCE, Listening

PLAN = SOURCE + '[[test]]\nkind = "hold"\ncurrent_A = 1.0\nduration_s = 1.0\n'
URL = "sim:,speed=max"


def test_a_carried_out_job_leaves_a_complete_record_and_a_report(tmp_path):
    job = Job(parse_plan(PLAN, "plan"), load_board(), URL, tmp_path, "unit 3", "someone")
    progress = Listening()
    done = asyncio.run(carry_out(job, progress, StopRequest()))
    assert done.report is not None and done.report.is_file()
    assert progress.kept is not None and progress.kept.record == str(done.record)
    with open_record(done.record) as record:
        assert record.state == "complete"
        assert record.run_result() == done.result
        kinds = [event.kind for event in record.events()]
        assert {"zero", "board-run", "enabled", "ended"} <= set(kinds)


def test_a_run_that_fails_leaves_a_record_that_says_so(tmp_path):
    (tmp_path / "off.toml").write_text('kind = "supply"\nvoltage_V = 0.01\nresistance_ohm = 0.05\n')
    job = Job(parse_plan(PLAN, "plan"), load_board(), f"sim:{tmp_path}/off.toml,speed=max", tmp_path)
    progress = Listening()
    with pytest.raises(SinkwrightError, match="no source is seen"):
        asyncio.run(carry_out(job, progress, StopRequest()))
    assert progress.kept is not None
    with open_record(progress.kept.record) as record:
        assert record.state == "failed"


def test_another_board_file_than_the_boards_own_is_warned_about(tmp_path):
    text = load_board().text
    other = parse_board(text + "\n# a file of another board\n")
    progress = Listening()
    asyncio.run(carry_out(Job(parse_plan(PLAN, "plan"), other, URL, tmp_path), progress, StopRequest()))
    warnings = [event.sentence for event in progress.events if isinstance(event, Warned)]
    assert any("set up from another board file" in warning for warning in warnings)


def test_a_run_that_has_not_been_fetched_keeps_the_next_one_from_beginning(tmp_path, monkeypatch):
    async def held(self: Instrument) -> BoardRun:
        return BoardRun(7, State.ENDED, RunEnd.VOLTAGE, False, True, 1, 2, 0, 0, 0)

    monkeypatch.setattr(Instrument, "board_run", held)
    job = Job(parse_plan(PLAN, "plan"), load_board(), URL, tmp_path)
    with pytest.raises(SinkwrightError, match="has not been fetched") as caught:
        asyncio.run(carry_out(job, Listening(), StopRequest()))
    assert "sinkwright resume" in str(caught.value)
    assert list(tmp_path.iterdir()) == []
