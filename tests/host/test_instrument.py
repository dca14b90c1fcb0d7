"""The instrument: SI outside, integers on the wire, and refusals a person can act on."""

from __future__ import annotations

import math
from typing import Any

import pytest

from sinkwright import instrument as module
from sinkwright.board_run import BoardEnds
from sinkwright.errors import AskedTooMuch, BoardRefused, LinkLost, SinkwrightError
from sinkwright.instrument import Instrument
from sinkwright.readings import LoadEvent
from sinkwright.runner import drive
from sinkwright_wire import messages as m
from sinkwright_wire.vocabulary import EventKind, Fault, Mode, Refusal, ResetCause, RunEnd, Silence, State
from tests.support.fake_board import FakeBoard
from tests.support.fake_channels import LockStepFake


class Bench:
    """An instrument on a fake board."""

    def __init__(self, monkeypatch: pytest.MonkeyPatch) -> None:
        self.board = FakeBoard()
        self.channel = LockStepFake(self.board)
        monkeypatch.setattr(module, "open_channel", lambda url: self.channel)
        self.load = drive(Instrument.open("fake:"))


@pytest.fixture
def bench(monkeypatch: pytest.MonkeyPatch) -> Bench:
    return Bench(monkeypatch)


def test_the_identity_tells_who_answers(bench: Bench) -> None:
    identity = bench.load.identity
    assert (identity.name, identity.board_id, identity.firmware_version) == (
        "fake-1",
        "0102030405060708",
        "0.1.0",
    )
    assert (identity.control_period_s, identity.board_file_crc, identity.simulated) == (
        0.00235,
        0xABCD,
        False,
    )
    assert identity.reset_cause == ResetCause.POWER_ON


def test_a_current_in_ampere_is_sent_in_microampere(bench: Bench) -> None:
    drive(bench.load.set_current(1.2345678))
    assert bench.board.acted[-1] == m.SetPoint(Mode.CURRENT, 1_234_568)


def test_power_resistance_and_voltage_are_sent_in_the_units_of_their_modes(bench: Bench) -> None:
    for coroutine in (
        bench.load.set_power(12.5),
        bench.load.set_resistance(6.0004),
        bench.load.set_voltage(3.3),
    ):
        drive(coroutine)
    assert bench.board.acted[-3:] == [
        m.SetPoint(Mode.POWER, 12_500_000),
        m.SetPoint(Mode.RESISTANCE, 6_000),
        m.SetPoint(Mode.VOLTAGE, 3_300_000),
    ]


@pytest.mark.parametrize("current_A", [math.nan, math.inf, -math.inf, -0.001, 2148.0, 1e30, True, "1", None])
def test_what_is_no_current_is_refused_before_anything_is_sent(bench: Bench, current_A: Any) -> None:
    sent = len(bench.channel.sent)
    with pytest.raises(AskedTooMuch, match="Nothing was sent to the load"):
        drive(bench.load.set_current(current_A))
    assert len(bench.channel.sent) == sent


def test_limits_come_in_si_units(bench: Bench) -> None:
    limits = drive(bench.load.limits("board"))
    assert (limits.current_A, limits.voltage_V, limits.power_W) == (4.0, 30.0, 40.0)
    assert (limits.heatsink_degC, limits.junction_degC, limits.slew_A_per_s, limits.silence_s) == (
        85,
        125,
        400,
        3,
    )


def test_setting_one_limit_leaves_the_others(bench: Bench) -> None:
    drive(bench.load.set_limits(current_A=2.5, silence_s=1.0))
    assert drive(bench.load.limits()).current_A == 2.5
    assert drive(bench.load.limits()).voltage_V == 30.0
    assert bench.load.link.silence_s == 1.0


def test_a_limit_beyond_the_board_names_the_largest_in_its_own_unit(bench: Bench) -> None:
    with pytest.raises(BoardRefused, match="the largest that fits is 85 °C"):
        drive(bench.load.set_limits(heatsink_degC=100))


def test_a_misspelt_limit_names_the_limits(bench: Bench) -> None:
    with pytest.raises(AskedTooMuch, match=r"curent_A is no limit.*current_A, voltage_V"):
        drive(bench.load.set_limits(curent_A=1))


def test_on_and_off_are_acted_upon(bench: Bench) -> None:
    drive(bench.load.set_current(1))
    drive(bench.load.on())
    assert drive(bench.load.status()).state == State.SINKING
    drive(bench.load.off())
    assert drive(bench.load.status()).state == State.OFF


def test_on_without_a_set_point_says_so(bench: Bench) -> None:
    with pytest.raises(BoardRefused, match="Give a set-point before turning the load on"):
        drive(bench.load.on())


def test_on_waits_for_the_current_zero(bench: Bench) -> None:
    bench.board.zero_ready_us = bench.board.time_us + 400_000
    drive(bench.load.set_current(1))
    drive(bench.load.on())
    assert bench.board.state == State.SINKING
    assert bench.board.time_us >= bench.board.zero_ready_us


def test_on_gives_up_on_a_zero_that_never_comes(bench: Bench) -> None:
    drive(bench.load.set_current(1))
    bench.board.answer_with[m.Enable] = m.Refused(m.Enable.ID, Refusal.ZERO_NOT_READY, detail=900)
    with pytest.raises(BoardRefused, match=r"still being measured, for 0.9 s more"):
        drive(bench.load.on())


def test_on_explains_a_latched_fault_with_reading_and_limit(bench: Bench) -> None:
    drive(bench.load.set_current(1))
    bench.board.trip(Fault.HEATSINK_HOT, 86_000, 85_000)
    with pytest.raises(BoardRefused) as caught:
        drive(bench.load.on())
    told = str(caught.value)
    assert "a fault is latched: The heatsink became hotter than its limit" in told
    assert "86 °C, limit 85 °C" in told
    assert "Its cause is gone: clear the fault" in told


def test_no_fault_is_none_and_a_fault_has_its_name_in_results(bench: Bench) -> None:
    assert drive(bench.load.fault()) is None
    bench.board.trip(Fault.HEATSINK_HOT, 86_000, 85_000)
    fault = drive(bench.load.fault())
    assert fault is not None
    assert (fault.name, fault.value, fault.limit, fault.unit) == ("heatsink-hot", 86.0, 85.0, "°C")
    drive(bench.load.clear())
    assert drive(bench.load.fault()) is None


def test_a_stream_is_rounded_to_whole_control_steps(bench: Bench) -> None:
    for interval_s, steps in [(0.1, 43), (0.00235, 1), (0.0001, 1), (1000.0, 65535), (0, 0)]:
        drive(bench.load.stream(interval_s))
        assert bench.board.acted[-1] == m.SetTelemetry(steps)


def test_samples_come_in_si_units_with_the_raw_integers_kept(bench: Bench) -> None:
    drive(bench.load.set_current(1.5))
    drive(bench.load.on())
    drive(bench.load.stream(0.1))
    sample = drive(bench.load.next_sample(1))
    assert sample is not None
    assert (sample.voltage_uV, sample.voltage_V, sample.current_A, sample.setpoint_A) == (
        12_000_000,
        12.0,
        1.5,
        1.5,
    )
    assert (sample.heatsink_degC, sample.state_name, sample.sinking) == (31.0, "sinking", True)


def test_no_sample_within_the_time_out_is_none(bench: Bench) -> None:
    assert drive(bench.load.next_sample(0.5)) is None


def test_events_reach_the_listeners_in_words(bench: Bench) -> None:
    told: list[LoadEvent] = []
    bench.load.on_event.append(told.append)
    bench.channel.pending += bench.board.trip(Fault.OVER_CURRENT, 4_200_000, 4_100_000)
    assert drive(bench.load.next_sample(0.2)) is None
    assert [event.kind for event in told] == [EventKind.FAULT]
    assert told[0].in_words == "The current was above its limit (4.2 A, limit 4.1 A)."


def test_the_run_log_is_fetched_whole(bench: Bench) -> None:
    log = drive(bench.load.log())
    assert log.spacing_s == 1.0
    assert [entry.charge_mC for entry in log.entries] == list(range(10))


def test_closing_turns_the_load_off_and_frees_the_board(bench: Bench) -> None:
    drive(bench.load.set_current(1))
    drive(bench.load.on())
    assert drive(bench.load.close()) is None
    assert bench.board.state == State.OFF
    assert bench.board.controller == 0
    assert bench.channel.closed


def test_closing_over_a_lost_link_raises_nothing_and_returns_why(bench: Bench) -> None:
    bench.board.silent = True
    failure = drive(bench.load.close())
    assert isinstance(failure, LinkLost)
    assert bench.channel.closed


def test_a_watcher_may_turn_off_and_closing_it_turns_nothing_off(monkeypatch: pytest.MonkeyPatch) -> None:
    board = FakeBoard()
    board.state, board.controller = State.SINKING, 77
    monkeypatch.setattr(module, "open_channel", lambda url: LockStepFake(board))
    watcher = drive(Instrument.open("fake:", watch=True))
    with pytest.raises(BoardRefused, match="Another host controls this board"):
        drive(watcher.set_current(1))
    drive(watcher.close())
    assert board.state == State.SINKING
    watcher = drive(Instrument.open("fake:", watch=True))
    drive(watcher.off())
    assert board.state == State.OFF


def test_an_opening_that_fails_lets_go_of_the_port(monkeypatch: pytest.MonkeyPatch) -> None:
    board = FakeBoard()
    board.silent = True
    channel = LockStepFake(board)
    monkeypatch.setattr(module, "open_channel", lambda url: channel)
    with pytest.raises(LinkLost, match="nothing answered"):
        drive(Instrument.open("fake:"))
    assert channel.closed


def test_after_a_restart_it_is_the_new_start_that_is_controlled(bench: Bench) -> None:
    before = bench.load.identity.boot_number
    drive(bench.load.restart())
    assert bench.load.identity.boot_number == before + 1
    assert bench.load.link.in_control
    drive(bench.load.set_current(1.0))


def test_a_restart_is_refused_while_the_load_is_on(bench: Bench) -> None:
    drive(bench.load.set_current(1.0))
    drive(bench.load.on())
    with pytest.raises(BoardRefused) as refused:
        drive(bench.load.restart())
    assert refused.value.refusal == Refusal.LOAD_IS_ON


def test_a_board_that_does_not_restart_is_told(bench: Bench) -> None:
    bench.board.answer_with[m.Restart] = m.Done(m.Restart.ID)
    with pytest.raises(LinkLost, match="asked to restart and has not"):
        drive(bench.load.restart(maintenance=True))


def running_alone(monkeypatch: pytest.MonkeyPatch) -> tuple[FakeBoard, LockStepFake]:
    """A board on which a run goes on without the host that started it."""
    bench = Bench(monkeypatch)
    drive(bench.load.set_current(1.0))
    drive(bench.load.set_ends(BoardEnds(voltage_V=3.0, duration_s=60.0)))
    drive(bench.load.on("continue", run=7))
    bench.board.controller = 0
    bench.board.acted.clear()
    return bench.board, bench.channel


def test_a_load_told_to_go_on_alone_gets_its_ends_and_its_name(bench: Bench) -> None:
    drive(bench.load.set_current(1.0))
    drive(bench.load.set_ends(BoardEnds(voltage_V=3.0, duration_s=60.0)))
    drive(bench.load.on("continue", run=7))
    assert m.SetEnds(3_000_000, 0, 0, 60_000, 0) in bench.board.acted
    assert bench.board.acted[-1] == m.Enable(Silence.CONTINUE, 7)
    run = drive(bench.load.board_run())
    assert (run.run, run.going, run.alone, run.fetched) == (7, True, True, False)
    drive(bench.load.mark_fetched(7))
    assert drive(bench.load.board_run()).fetched


def test_a_run_that_goes_on_alone_is_not_disturbed_by_whoever_connects(
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    board, _ = running_alone(monkeypatch)
    with pytest.raises(SinkwrightError, match="a run goes on by itself") as caught:
        drive(Instrument.open("fake:"))
    assert "sinkwright resume" in str(caught.value)
    assert board.state == State.SINKING
    assert not any(isinstance(message, m.Disable) for message in board.acted)


def test_a_run_that_goes_on_alone_may_be_watched_and_turned_off(monkeypatch: pytest.MonkeyPatch) -> None:
    board, _ = running_alone(monkeypatch)
    watching = drive(Instrument.open("fake:", watch=True))
    assert drive(watching.board_run()).going
    drive(watching.off())
    assert board.state == State.OFF


def test_names_of_runs_differ_and_are_never_0(bench: Bench) -> None:
    first, second = bench.load.name_run(), bench.load.name_run()
    assert 0 < first != second > 0


def test_an_end_on_the_board_is_told_in_words() -> None:
    event = LoadEvent(1, 5, EventKind.ENDED, int(RunEnd.CHARGE), 0, 0)
    assert (event.name, event.in_words) == (
        "ended",
        "The board ended the run. The charge asked for has flowed.",
    )
    for kind in (EventKind.BUTTON, EventKind.RESTART):
        assert LoadEvent(1, 5, kind, 0, 0, 0).in_words.endswith(".")
