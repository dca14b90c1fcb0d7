"""Pacing a simulated board against the wall clock: speed, latency, backlog, and the lead over a slow host."""

from __future__ import annotations

import time

import pytest

from sinkwright.simulator.pace import MAX_BACKLOG_S
from sinkwright.transport.simulated import MAX_GRANT_US, PACE_S, PacedPort


class CountingBoard:
    """A board that only lets time pass and answers what it is told."""

    def __init__(self) -> None:
        self.board_time_us = 0
        self.grants: list[int] = []
        self.closed = False

    def exchange(self, data: bytes, grant_us: int) -> tuple[bytes, int]:
        self.grants.append(grant_us)
        self.board_time_us += grant_us
        return data.upper(), self.board_time_us

    def close(self) -> None:
        self.closed = True


class Wall:
    """A wall clock that a test moves."""

    def __init__(self) -> None:
        self.now_s = 100.0

    def monotonic(self) -> float:
        return self.now_s


@pytest.fixture
def wall(monkeypatch: pytest.MonkeyPatch) -> Wall:
    clock = Wall()
    monkeypatch.setattr(time, "monotonic", clock.monotonic)
    return clock


STEP_S = 0.05


def _run(port: PacedPort, wall: Wall, wall_s: float) -> None:
    for _ in range(round(wall_s / STEP_S)):
        wall.now_s += STEP_S
        before_s = -1.0
        while port.now_s() != before_s:
            before_s = port.now_s()
            port.read()


@pytest.mark.parametrize("speed", [0.5, 1.0])
def test_time_passes_at_the_asked_speed(wall: Wall, speed: float) -> None:
    port = PacedPort(CountingBoard(), speed, silence_s=3)
    _run(port, wall, 2.0)
    assert port.now_s() == pytest.approx(2.0 * speed, abs=2 * PACE_S * speed)


def test_above_real_time_the_board_waits_for_the_host_at_half_the_silence_limit(wall: Wall) -> None:
    port = PacedPort(CountingBoard(), 100.0, silence_s=3)
    _run(port, wall, 0.5)
    assert port.now_s() == pytest.approx(1.5)
    port.write(b"beat")
    _run(port, wall, 0.5)
    assert port.now_s() == pytest.approx(3.0, abs=MAX_GRANT_US / 1e6)


def test_at_real_time_the_board_does_not_wait_for_a_silent_host(wall: Wall) -> None:
    port = PacedPort(CountingBoard(), 1.0, silence_s=3)
    _run(port, wall, 4.0)
    assert port.now_s() == pytest.approx(4.0, abs=2 * PACE_S)


def test_what_was_sent_is_answered_without_waiting_for_time_to_be_due(wall: Wall) -> None:
    board = CountingBoard()
    port = PacedPort(board, 1.0, silence_s=3)
    port.write(b"hello")
    assert port.read() == b"HELLO"
    assert board.grants == [1]


def test_a_single_grant_is_bounded_so_that_bytes_do_not_wait_behind_it(wall: Wall) -> None:
    board = CountingBoard()
    port = PacedPort(board, 10.0, silence_s=3)
    wall.now_s += 0.5
    port.read()
    assert board.grants == [MAX_GRANT_US]


def test_a_machine_that_slept_does_not_run_the_night_through_at_once(wall: Wall) -> None:
    port = PacedPort(CountingBoard(), 1.0, silence_s=3)
    wall.now_s += 8 * 3600
    _run(port, wall, 0.1)
    assert port.now_s() <= MAX_BACKLOG_S + 0.2


def test_closing_powers_the_board_down() -> None:
    board = CountingBoard()
    PacedPort(board, 1.0, silence_s=3).close()
    assert board.closed
