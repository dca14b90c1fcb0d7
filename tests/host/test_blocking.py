"""`connect`: the load is turned off however it is left, never on without an end, and works in a notebook."""

from __future__ import annotations

import asyncio
import time
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

import sinkwright
from sinkwright import blocking, instrument
from sinkwright.blocking import Load, connect
from sinkwright.errors import AskedTooMuch, LinkLost, ProtectionTripped
from sinkwright.runner import Runner
from sinkwright.transport.reader_thread import ThreadedChannel
from sinkwright_wire import messages as m
from sinkwright_wire.vocabulary import Fault, State
from tests.support.fake_board import FakeBoard
from tests.support.fake_channels import LockStepFake, PacedFake

Opener = Callable[[FakeBoard], Load]


@pytest.fixture
def lock_step(monkeypatch: pytest.MonkeyPatch) -> Opener:
    def open_(board: FakeBoard) -> Load:
        monkeypatch.setattr(instrument, "open_channel", lambda url: LockStepFake(board))
        monkeypatch.setattr(Runner, "for_url", lambda url: Runner(lock_step=True))
        return connect("fake:")

    return open_


@pytest.fixture
def real_time(monkeypatch: pytest.MonkeyPatch) -> Opener:
    def open_(board: FakeBoard) -> Load:
        monkeypatch.setattr(instrument, "open_channel", lambda url: ThreadedChannel(url, PacedFake(board)))
        return connect("/dev/fake")

    return open_


@pytest.fixture(params=["lock_step", "real_time"])
def opener(request: pytest.FixtureRequest) -> Any:
    return request.getfixturevalue(request.param)


def test_leaving_the_block_turns_the_load_off(opener: Opener) -> None:
    board = FakeBoard()
    with opener(board) as load:
        load.set_current(1.0)
        load.on(for_s=60)
        assert load.status().current_A == 1.0
    assert board.state == State.OFF
    assert board.controller == 0


def test_an_exception_turns_the_load_off_and_goes_on(opener: Opener) -> None:
    board = FakeBoard()
    with pytest.raises(LookupError), opener(board) as load:
        load.set_current(1.0)
        load.on(for_s=60)
        raise LookupError
    assert board.state == State.OFF


def test_a_lost_board_does_not_hide_the_earlier_exception(lock_step: Opener) -> None:
    board = FakeBoard()
    with pytest.raises(LookupError), lock_step(board):
        board.silent = True
        raise LookupError


def test_a_board_lost_at_the_end_is_told(lock_step: Opener) -> None:
    board = FakeBoard()
    with pytest.raises(LinkLost, match="stopped answering"), lock_step(board):
        board.silent = True


@pytest.mark.parametrize("for_s", [None, 0, -1, float("nan"), float("inf")])
def test_on_demands_an_end(lock_step: Opener, for_s: float | None) -> None:
    board = FakeBoard()
    with lock_step(board) as load:
        load.set_current(1.0)
        with pytest.raises(AskedTooMuch, match=r"nothing says when.*load.on\(for_s=10\)"):
            load.on(for_s=for_s)
        assert board.state == State.OFF


def test_the_load_turns_off_after_its_time_on_the_loads_clock(lock_step: Opener) -> None:
    board = FakeBoard()
    with lock_step(board) as load:
        load.set_current(1.0)
        load.on(for_s=10)
        load.wait(9.9)
        assert board.state == State.SINKING
        load.wait(0.2)
        assert board.state == State.OFF


def test_the_load_turns_off_in_time_while_the_script_sleeps(real_time: Opener) -> None:
    board = FakeBoard()
    with real_time(board) as load:
        load.set_current(1.0)
        load.on(for_s=0.2)
        time.sleep(0.5)
        assert board.state == State.OFF
        assert board.acted[-1] == m.Disable()


def test_the_host_is_heard_while_the_script_sleeps(real_time: Opener) -> None:
    board = FakeBoard()
    with real_time(board) as load:
        load.set_limits(silence_s=0.3)
        load.set_current(1.0)
        load.on(for_s=60)
        time.sleep(0.8)
        assert load.status().state == State.SINKING


def test_it_works_inside_a_running_event_loop(opener: Opener) -> None:
    board = FakeBoard()

    async def notebook_cell() -> float:
        with opener(board) as load:
            load.set_current(0.5)
            load.on(for_s=60)
            return load.measure().current_A

    assert asyncio.run(notebook_cell()) == 0.5
    assert board.state == State.OFF


def test_a_measurement_is_fresh(lock_step: Opener) -> None:
    board = FakeBoard()
    with lock_step(board) as load:
        load.set_current(1.0)
        load.on(for_s=60)
        load.measure()
        load.wait(5)
        asked_us = board.time_us
        assert load.measure().time_us == pytest.approx(asked_us + 100_000, abs=5_000)


def test_samples_come_for_the_asked_time(opener: Opener) -> None:
    board = FakeBoard()
    with opener(board) as load:
        assert len(list(load.samples(for_s=0.5, interval_s=0.05))) in (9, 10, 11)
        assert isinstance(board.acted[-1], m.SetTelemetry)
        assert board.acted[-1].every_steps == 0


def test_samples_without_a_time_end_when_the_load_turns_off(lock_step: Opener) -> None:
    board = FakeBoard()
    with lock_step(board) as load:
        load.set_current(1.0)
        load.on(for_s=2)
        samples = list(load.samples())
    assert 18 <= len(samples) <= 21
    assert samples[0].sinking


def test_samples_without_any_end_are_refused(lock_step: Opener) -> None:
    with lock_step(FakeBoard()) as load, pytest.raises(AskedTooMuch, match="samples without an end"):
        load.samples()


def test_a_protection_that_trips_is_raised_with_its_name_and_words(lock_step: Opener) -> None:
    board = FakeBoard()
    with lock_step(board) as load:
        load.set_current(1.0)
        load.on(for_s=60)
        with pytest.raises(ProtectionTripped) as caught:
            for at, _ in enumerate(load.samples()):
                if at == 3:
                    board.trip(Fault.HEATSINK_HOT, 86_000, 85_000)
    assert caught.value.fault == "heatsink-hot"
    assert "86 °C, limit 85 °C" in str(caught.value)
    assert "The load is off." in str(caught.value)


def test_a_closed_load_says_so(lock_step: Opener) -> None:
    load = lock_step(FakeBoard())
    load.close()
    load.close()
    with pytest.raises(LinkLost, match="was closed"):
        load.status()


def test_a_failed_connection_leaves_no_thread_behind(monkeypatch: pytest.MonkeyPatch) -> None:
    import threading

    with pytest.raises(LinkLost, match="there is no such port"):
        connect("/dev/no-such-port")
    assert "sinkwright loop" not in [thread.name for thread in threading.enumerate()]


def test_connect_is_found_in_the_package_and_its_version_is_the_distributions() -> None:
    assert sinkwright.connect is blocking.connect
    declared = (Path(__file__).parents[2] / "pyproject.toml").read_text()
    assert f'version = "{sinkwright.__version__}"' in declared
