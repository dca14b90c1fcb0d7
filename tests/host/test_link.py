"""The link: retries that never act twice, heartbeats, interruption, and what is said when a board is lost."""

from __future__ import annotations

import asyncio
from typing import Any

import pytest

from sinkwright.errors import BoardRefused, Interrupted, LinkLost
from sinkwright.link import Link
from sinkwright.runner import drive
from sinkwright.stopping import StopRequest
from sinkwright.transport.reader_thread import ThreadedChannel
from sinkwright_wire import messages as m
from sinkwright_wire.framing import encode_frame
from sinkwright_wire.vocabulary import LimitField, Mode, Refusal, State
from tests.support.fake_board import FakeBoard
from tests.support.fake_channels import LockStepFake, PacedFake

CURRENT_1A = m.SetPoint(Mode.CURRENT, 1_000_000)


def _linked(board: FakeBoard, **options: Any) -> Link:
    link = Link(LockStepFake(board), **options)
    drive(link.open())
    return link


def test_opening_greets_the_board_and_takes_control() -> None:
    link = _linked(FakeBoard(name="bench-1"))
    assert link.hello.name == "bench-1"
    assert link.in_control


def test_a_watcher_takes_no_control_and_beats_no_heart() -> None:
    board = FakeBoard()
    link = Link(LockStepFake(board))
    drive(link.open(watch=True))
    drive(link.pause(10))
    assert not link.in_control
    assert not [heard for heard in board.heard if isinstance(heard, m.Beat)]


@pytest.mark.parametrize("lost", [1, 2])
def test_a_lost_reply_is_asked_for_again_and_the_board_acts_once(lost: int) -> None:
    board = FakeBoard()
    link = _linked(board)
    board.lose_replies = lost
    assert isinstance(drive(link.request(CURRENT_1A)), m.Done)
    assert board.acted == [CURRENT_1A]
    assert link.counters.retries == lost


def test_a_lost_request_is_sent_again_and_the_board_acts_once() -> None:
    board = FakeBoard()
    link = _linked(board)
    board.lose_requests = 1
    drive(link.request(CURRENT_1A))
    assert board.acted == [CURRENT_1A]


def test_a_reply_that_comes_twice_is_taken_once() -> None:
    board = FakeBoard()
    link = _linked(board)
    board.reply_twice = True
    drive(link.request(CURRENT_1A))
    assert isinstance(drive(link.request(m.GetStatus())), m.Status)
    assert link.counters.stale_replies >= 1


def test_garbage_around_a_reply_is_counted_and_passed_over() -> None:
    board = FakeBoard()
    link = _linked(board)
    board.before_reply = b"\x7e\x01\x02\x03\xff\xfe\x00garbage\x80\x7e"
    assert isinstance(drive(link.request(m.GetStatus())), m.Status)
    assert link.counters.discarded >= 1


def test_what_the_board_prints_goes_to_the_text_callback() -> None:
    board = FakeBoard()
    told: list[str] = []
    link = _linked(board, on_text=told.append)
    board.before_reply = b"\x7emain.py: ready\r\n\x7e" + encode_frame(m.pack(m.LogLine(20, "fan on")))
    drive(link.request(m.GetStatus()))
    assert told == ["main.py: ready", "fan on"]


def test_time_outs_count_the_channels_clock() -> None:
    board = FakeBoard()
    link = _linked(board)
    board.silent = True
    before_s = link.channel.now_s()
    with pytest.raises(LinkLost, match=r"stopped answering \(1.5 s without a reply\)"):
        drive(link.request(m.GetStatus(), timeout_s=0.5, tries=3))
    assert link.channel.now_s() - before_s == pytest.approx(1.5, abs=0.01)


def test_after_a_request_was_given_up_the_next_one_works_again() -> None:
    board = FakeBoard()
    link = _linked(board)
    board.lose_requests = 3
    with pytest.raises(LinkLost):
        drive(link.request(CURRENT_1A))
    drive(link.request(m.SetPoint(Mode.CURRENT, 2_000_000)))
    assert board.acted == [m.SetPoint(Mode.CURRENT, 2_000_000)]


def test_off_waits_for_no_greeting_when_the_sequence_is_in_doubt() -> None:
    board = FakeBoard()
    link = _linked(board)
    board.silent = True
    with pytest.raises(LinkLost):
        drive(link.request(CURRENT_1A))
    board.silent, heard_before = False, len(board.heard)
    drive(link.request(m.Disable()))
    assert [type(heard) for heard in board.heard[heard_before:]] == [m.Disable]


def test_the_heart_beats_when_nothing_else_is_said() -> None:
    board = FakeBoard()
    link = _linked(board)
    drive(link.request(CURRENT_1A))
    drive(link.request(m.Enable()))
    drive(link.pause(30))
    assert board.state == State.SINKING
    beats = sum(isinstance(heard, m.Beat) for heard in board.heard)
    assert 30 / 0.75 - 2 <= beats <= 30 / 0.75 + 1


def test_pushes_that_come_during_a_request_are_kept_in_order() -> None:
    board = FakeBoard()
    link = _linked(board)
    drive(link.request(m.SetTelemetry(43)))
    drive(link.pause(1))
    drive(link.request(m.GetStatus()))
    numbers = []
    while isinstance(push := drive(link.next_push(0)), m.Telemetry):
        numbers.append(push.number)
    assert numbers == list(range(1, 10))


def test_missing_telemetry_is_counted() -> None:
    board = FakeBoard()
    link = _linked(board)
    drive(link.request(m.SetTelemetry(43)))
    assert drive(link.next_push(1))
    board._number += 5
    assert drive(link.next_push(1))
    assert link.counters.missing_telemetry == 5


def test_no_push_within_the_time_out_is_none() -> None:
    link = _linked(FakeBoard())
    assert drive(link.next_push(0.3)) is None


def test_a_refusal_carries_its_sentence_and_the_largest_that_fits() -> None:
    link = _linked(FakeBoard())
    with pytest.raises(BoardRefused) as caught:
        drive(link.request(m.SetPoint(Mode.CURRENT, 5_000_000)))
    assert "the largest that fits is 4 A" in str(caught.value)
    assert caught.value.refusal == Refusal.BEYOND_LIMIT
    assert (caught.value.field, caught.value.detail) == (LimitField.CURRENT, 4_000_000)


def test_a_stop_is_heeded_before_a_request_and_while_waiting_but_not_when_finishing() -> None:
    stop = StopRequest()
    board = FakeBoard()
    link = _linked(board, stop=stop)
    stop.request()
    with pytest.raises(Interrupted):
        drive(link.request(CURRENT_1A))
    with pytest.raises(Interrupted):
        drive(link.next_push(1))
    with link.finishing():
        drive(link.request(m.Disable()))
    assert board.acted == [m.Disable()]


def test_a_stop_ends_a_greeting_that_nobody_answers() -> None:
    stop = StopRequest()
    stop.request()
    with pytest.raises(Interrupted):
        drive(Link(LockStepFake(lambda data: b""), stop=stop).open())


def test_a_stop_wakes_a_link_that_waits_in_an_event_loop() -> None:
    stop = StopRequest()

    async def scenario() -> None:
        link = Link(ThreadedChannel("fake:", PacedFake(FakeBoard())), stop=stop)
        await link.open()
        asyncio.get_running_loop().call_later(0.05, stop.request)
        with pytest.raises(Interrupted):
            await link.next_push(30)
        link.close()

    asyncio.run(asyncio.wait_for(scenario(), 10))


def test_a_request_does_not_queue_behind_somebody_who_waits_for_a_push() -> None:
    async def scenario() -> None:
        link = Link(ThreadedChannel("fake:", PacedFake(FakeBoard())))
        await link.open()
        waiting = asyncio.create_task(link.next_push(30))
        await asyncio.sleep(0.05)
        assert isinstance(await asyncio.wait_for(link.request(m.GetStatus()), 5), m.Status)
        waiting.cancel()
        link.close()

    asyncio.run(asyncio.wait_for(scenario(), 20))


def test_after_a_request_was_cancelled_the_next_one_works() -> None:
    async def scenario() -> None:
        board = FakeBoard()
        link = Link(ThreadedChannel("fake:", PacedFake(board)))
        await link.open()
        board.lose_requests = 1
        asked = asyncio.create_task(link.request(CURRENT_1A))
        await asyncio.sleep(0.05)
        asked.cancel()
        await asyncio.wait([asked])
        await link.request(m.SetPoint(Mode.CURRENT, 2_000_000))
        assert board.acted == [m.SetPoint(Mode.CURRENT, 2_000_000)]
        link.close()

    asyncio.run(asyncio.wait_for(scenario(), 10))


# -- control ------------------------------------------------------------------------------------------------


class Shared(LockStepFake):
    """A second program's way to a board whose first program lives and beats, or has died."""

    def __init__(self, board: FakeBoard, other_lives: bool) -> None:
        super().__init__(board)
        self.board = board
        self.other_lives = other_lives

    async def receive(self, timeout_s: float) -> bytes:
        data = await super().receive(timeout_s)
        if self.other_lives:
            self.board._heard_us = self.board.time_us
        return data


def test_a_board_that_a_living_program_controls_is_refused() -> None:
    board = FakeBoard()
    _linked(board, session=77)
    board.time_us += 400_000
    link = Link(Shared(board, other_lives=True))
    with pytest.raises(BoardRefused, match="another program controls this board"):
        drive(link.open())


def test_control_is_gained_from_a_program_that_died_once_the_silence_limit_has_passed() -> None:
    board = FakeBoard()
    _linked(board, session=77)
    link = Link(Shared(board, other_lives=False))
    drive(link.open())
    assert link.in_control


def test_released_control_is_free_at_once() -> None:
    board = FakeBoard()
    first = _linked(board, session=77)
    drive(first.release())
    assert board.controller == 0
    before_us = board.time_us
    assert _linked(board).in_control
    assert board.time_us == before_us
