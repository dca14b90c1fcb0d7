"""Lock-step: simulated time advances only inside a wait, by grants that are bounded."""

from __future__ import annotations

import asyncio

import pytest

from sinkwright.errors import LinkLost
from sinkwright.transport.lockstep import GRANT_S, LockStepChannel

STEP_US = 2350


class ScriptedBoard:
    """Says what its script holds once its clock is there; like the real one it passes a grant a little."""

    def __init__(self, script: dict[int, bytes]) -> None:
        self.board_time_us = 0
        self.script = dict(script)
        self.heard: list[bytes] = []
        self.grants: list[int] = []
        self.closed = 0

    def exchange(self, data: bytes, grant_us: int) -> tuple[bytes, int]:
        self.heard.append(data)
        self.grants.append(grant_us)
        end_us = self.board_time_us + grant_us
        while self.board_time_us < end_us:
            self.board_time_us += STEP_US
            due = [at for at in self.script if at <= self.board_time_us]
            if due:
                return self.script.pop(due[0]), self.board_time_us
        return b"", self.board_time_us

    def run_ahead(self, grant_us: int) -> None:
        self.ahead = self.exchange(b"", grant_us)

    def catch_up(self) -> tuple[bytes, int]:
        return self.ahead

    def close(self) -> None:
        self.closed += 1


def receive_inline(channel: LockStepChannel, timeout_s: float) -> bytes:
    """Drive the coroutine without an event loop: it must not suspend once."""
    waiting = channel.receive(timeout_s)
    with pytest.raises(StopIteration) as finished:
        waiting.send(None)
    return finished.value.value


def test_receiving_never_suspends_and_returns_as_soon_as_the_board_speaks():
    channel = LockStepChannel("sim:", ScriptedBoard({250_000: b"hello"}))
    assert receive_inline(channel, 10.0) == b"hello"
    assert channel.now_s() == pytest.approx(0.25, abs=STEP_US / 1e6)


def test_a_silent_board_times_out_by_its_own_clock():
    channel = LockStepChannel("sim:", ScriptedBoard({}))
    assert receive_inline(channel, 3600.0) == b""
    assert channel.now_s() == pytest.approx(3600.0, abs=STEP_US / 1e6)


def test_no_grant_is_longer_than_a_telemetry_interval_or_than_the_time_out():
    board = ScriptedBoard({})
    channel = LockStepChannel("sim:", board)
    receive_inline(channel, 0.03)
    receive_inline(channel, 0.25)
    assert max(board.grants) == round(GRANT_S * 1e6)
    assert board.grants[0] == 30_000
    assert channel.now_s() <= 0.28 + 2 * STEP_US / 1e6


def test_what_was_sent_goes_over_once_and_together_with_the_next_wait():
    board = ScriptedBoard({})
    channel = LockStepChannel("sim:", board)
    channel.send(b"one ")
    channel.send(b"two")
    assert board.heard == []
    receive_inline(channel, 0.3)
    assert board.heard[0] == b"one two"
    assert not any(board.heard[1:])


def test_a_wait_of_no_time_still_hands_over_what_was_sent():
    board = ScriptedBoard({})
    channel = LockStepChannel("sim:", board)
    channel.send(b"request")
    assert receive_inline(channel, 0.0) == b""
    assert (board.heard, board.grants) == ([b"request"], [0])


def test_a_wake_ends_the_wait_after_one_grant_and_only_that_wait():
    board = ScriptedBoard({})
    channel = LockStepChannel("sim:", board)
    channel.wake()
    receive_inline(channel, 50.0)
    assert len(board.grants) == 1
    receive_inline(channel, 1.0)
    assert len(board.grants) > 5


def test_it_works_the_same_inside_an_event_loop():
    channel = LockStepChannel("sim:", ScriptedBoard({5000: b"x"}))
    assert asyncio.run(channel.receive(1.0)) == b"x"


def test_a_board_that_has_ended_is_lost_at_every_call():
    class Ended(ScriptedBoard):
        def exchange(self, data: bytes, grant_us: int) -> tuple[bytes, int]:
            raise LinkLost("ended")

    channel = LockStepChannel("sim:", Ended({}))
    for _ in range(2):
        with pytest.raises(LinkLost):
            asyncio.run(channel.receive(1.0))


def test_it_says_what_it_is_and_closes_its_board():
    board = ScriptedBoard({})
    channel = LockStepChannel("sim:,speed=max", board)
    assert (channel.url, channel.simulated, channel.lock_step) == ("sim:,speed=max", True, True)
    channel.close()
    assert board.closed == 1


def test_while_frames_only_stream_in_the_board_runs_one_grant_ahead():
    board = ScriptedBoard({at: b"frame" for at in range(100_000, 1_000_000, 100_000)})
    channel = LockStepChannel("sim:", board)
    clocks = []
    for _ in range(4):
        assert receive_inline(channel, 1.0) == b"frame"
        clocks.append((round(channel.now_s(), 1), round(board.board_time_us / 1e6, 1)))
    assert clocks == [(0.1, 0.1), (0.2, 0.3), (0.3, 0.4), (0.4, 0.5)]


def test_what_is_sent_meanwhile_arrives_with_the_next_grant_and_then_the_board_waits_again():
    board = ScriptedBoard({at: b"frame" for at in range(100_000, 1_000_000, 100_000)})
    channel = LockStepChannel("sim:", board)
    receive_inline(channel, 1.0), receive_inline(channel, 1.0)
    channel.send(b"off")
    assert receive_inline(channel, 1.0) == b"frame"
    assert board.heard[-1] == b""
    assert receive_inline(channel, 1.0) == b"frame"
    assert board.heard[-1] == b"off"
    assert channel.now_s() == pytest.approx(board.board_time_us / 1e6)


def test_a_board_that_ends_while_it_runs_ahead_is_told_by_the_next_receive():
    class Ends(ScriptedBoard):
        def run_ahead(self, grant_us: int) -> None:
            raise LinkLost("gone")

    channel = LockStepChannel("sim:", Ends({100_000: b"one", 200_000: b"two", 300_000: b"three"}))
    assert [receive_inline(channel, 1.0) for _ in range(3)] == [b"one", b"two", b"three"]
