"""Runs that the board would go on with alone: how they begin, how they end with the host there, what is kept."""

from __future__ import annotations

import pytest

from sinkwright.board_run import BoardEnds
from sinkwright_wire.messages import LogEntry
from sinkwright_wire.vocabulary import RunEnd
from tests.host.procedures.carrying_out import SOURCE, Run
from tests.support.fake_instrument import FakeInstrument

ALONE = 'when_host_silent = "continue"\n'
HOLD = '[[test]]\nkind = "hold"\ncurrent_A = 2.0\n'
ENDS = "end_voltage_V = 10.0\nend_charge_Ah = 1.0\n"


def ended_at(frame: int, reason: RunEnd) -> dict:
    def end(instrument: FakeInstrument) -> None:
        instrument.end(reason)

    return {frame: end}


def test_a_hold_tells_the_board_its_ends_and_under_which_policy() -> None:
    run = Run(ALONE + SOURCE + HOLD + ENDS, at_frame=ended_at(60, RunEnd.CHARGE))
    run.carry_out()
    assert run.instrument.ends == BoardEnds(voltage_V=10.0, charge_Ah=1.0)
    assert "on alone" in run.instrument.calls


def test_known_leads_are_taken_off_the_end_voltage_that_the_board_is_told() -> None:
    leads = (
        SOURCE + 'sense = "two-wire"\nlead_resistance_ohm = 0.1\nlead_resistance_uncertainty_ohm = 0.005\n'
    )
    run = Run(leads + HOLD + "end_voltage_V = 11.8\nduration_s = 3.0\n")
    run.carry_out()
    assert run.instrument.ends == BoardEnds(voltage_V=pytest.approx(11.6), duration_s=3.0)


@pytest.mark.parametrize(
    ("reason", "key"),
    [
        (RunEnd.VOLTAGE, "end_voltage_V"),
        (RunEnd.CHARGE, "end_charge_Ah"),
        (RunEnd.ENERGY, "end_energy_Wh"),
        (RunEnd.DURATION, "duration_s"),
        (RunEnd.TEMPERATURE, "end_temperature_degC"),
    ],
)
def test_a_hold_that_the_board_ends_is_ended_as_planned(reason: RunEnd, key: str) -> None:
    (test,) = Run(SOURCE + HOLD + "duration_s = 600.0\n", at_frame=ended_at(60, reason)).carry_out().tests
    assert test.stopped_by == key
    assert test.quantities["current_A"].value == pytest.approx(2.0, abs=0.001)


def test_the_record_names_each_run_and_its_test() -> None:
    run = Run(SOURCE + HOLD + "duration_s = 1.0\n" + HOLD + "duration_s = 1.0\n")
    run.carry_out()
    named = [data for _, kind, _, data in run.writer.events if kind == "board-run"]
    assert named == [{"run": 1, "test": 1, "alone": False}, {"run": 2, "test": 2, "alone": False}]


def test_a_lone_run_that_its_host_saw_to_the_end_is_marked_as_fetched() -> None:
    run = Run(ALONE + SOURCE + HOLD + ENDS, at_frame=ended_at(60, RunEnd.CHARGE))
    run.carry_out()
    assert run.instrument.fetched == [1]


def test_a_lone_run_whose_record_cannot_be_written_stays_on_the_board() -> None:
    run = Run(ALONE + SOURCE + HOLD + ENDS, at_frame=ended_at(60, RunEnd.CHARGE))
    run.writer.failed = True
    run.carry_out()
    assert run.instrument.fetched == []


def test_tests_that_are_stepped_by_the_host_do_not_go_on_alone() -> None:
    run = Run(ALONE + SOURCE + '[[test]]\nkind = "load-regulation"\n')
    run.carry_out()
    assert "on alone" not in run.instrument.calls
    assert run.instrument.ends == BoardEnds()


def test_what_a_sleeping_computer_missed_is_taken_from_the_boards_log() -> None:
    def sleep(instrument: FakeInstrument) -> None:
        instrument.time_us += 60_000_000
        instrument.kept = tuple(LogEntry(s * 1000, 12, 11, 13, 2, 3000, s) for s in range(1, 70))

    run = Run(ALONE + SOURCE + HOLD + ENDS, at_frame={60: sleep, **ended_at(80, RunEnd.CHARGE)})
    run.carry_out()
    kept = run.writer.board_log
    missed = [entry.time_us for entry in kept if entry.missed]
    assert len(kept) == 69
    assert len(missed) in (60, 61)
    before_us, after_us = (run.writer.samples[at].time_us for at in (59, 60))
    assert all(before_us < time_us < after_us for time_us in missed)
    assert any("coarser than the rest" in text for text in run.texts("warning"))
    assert run.instrument.fetched == [1]


def test_means_of_the_last_tenth_are_the_boards_where_the_computer_slept_through_it() -> None:
    def sleep_through(instrument: FakeInstrument) -> None:
        instrument.time_us += 60_000_000
        instrument.kept = tuple(
            LogEntry(s * 1000, 11_000_000 - s, 10_999_000, 11_001_000, 2_000_000, 3000, 2000 * s)
            for s in range(1, 66)
        )
        instrument.end(RunEnd.VOLTAGE)

    run = Run(ALONE + SOURCE + HOLD + ENDS, at_frame={60: sleep_through})
    (test,) = run.carry_out().tests
    assert test.stopped_by == "end_voltage_V"
    assert test.quantities["voltage_V"].value == pytest.approx(11.0, abs=0.001)
