"""What is said when a link fails: nobody of ours answered, or a board that was there is lost."""

from __future__ import annotations

import asyncio
import dataclasses
from collections.abc import Callable
from typing import Any

import pytest

from sinkwright.errors import LinkLost
from sinkwright.link import Link
from sinkwright.runner import drive
from sinkwright.transport.reader_thread import ThreadedChannel
from sinkwright_wire import messages as m
from sinkwright_wire.framing import encode_frame
from sinkwright_wire.vocabulary import EventKind, Fault, Mode
from tests.support.fake_board import FakeBoard
from tests.support.fake_channels import LockStepFake, PacedFake

CURRENT_1A = m.SetPoint(Mode.CURRENT, 1_000_000)


def _linked(board: FakeBoard, **options: Any) -> Link:
    link = Link(LockStepFake(board), **options)
    drive(link.open())
    return link


# -- first contact ------------------------------------------------------------------------------------------


def _first_contact(answer: Callable[[bytes], bytes]) -> str:
    with pytest.raises(LinkLost) as caught:
        drive(Link(LockStepFake(answer, url="/dev/x")).open())
    assert "No load was touched." in str(caught.value)
    return str(caught.value)


def _once(answer: bytes) -> Callable[[bytes], bytes]:
    answers = [answer]
    return lambda data: answers.pop() if answers else b""


def test_silence_is_told_as_silence() -> None:
    assert "/dev/x: nothing answered." in _first_contact(lambda data: b"")


def test_another_protocol_is_quoted() -> None:
    assert "bytes came, but none were ours: text 'login:'" in _first_contact(_once(b"\r\nlogin: "))


def test_binary_chatter_is_shown_as_bytes() -> None:
    told = _first_contact(_once(b"\x00\xb5\x62\x01\x07\x5c\x00\xff\xfe"))
    assert "none were ours: 9 or more bytes that begin 00 b5 62" in told


def test_an_echo_is_told_as_a_loop() -> None:
    assert "loops to itself" in _first_contact(lambda data: data)


def test_an_interpreter_prompt_says_that_the_firmware_does_not_run() -> None:
    told = _first_contact(lambda data: b"MicroPython v1.29 on 2026-08-01\r\n>>> ")
    assert "a MicroPython prompt" in told


def test_chatter_without_end_does_not_hold_the_greeting_up() -> None:
    class Chatterer(LockStepFake):
        async def receive(self, timeout_s: float) -> bytes:
            self._time_us += 1000
            return b"tick "

    with pytest.raises(LinkLost, match="text 'tick tick"):
        drive(Link(Chatterer(lambda data: b"")).open())


def test_firmware_of_another_wire_version_is_named() -> None:
    def answer(data: bytes) -> bytes:
        reply = FakeBoard()._greet(m.parse(m.pack(m.Hello(), 1, 1)), m.Hello())
        assert isinstance(reply, m.HelloReply)
        return encode_frame(m.pack(dataclasses.replace(reply, wire_version=9), 1, 1))

    assert "speaks wire version 9, this program version 1" in _first_contact(answer)


def test_a_session_is_drawn_so_that_its_greeting_restarts_no_strangers_board() -> None:
    for _ in range(50):
        channel = LockStepFake(lambda data: b"")
        channel.lock_step = False
        with pytest.raises(LinkLost):
            drive(Link(channel).open(tries=1))
        assert b"\x04" not in channel.sent[0]


# -- losing a board that was there --------------------------------------------------------------------------


def test_unplugging_mid_run_tells_what_is_known_and_what_the_board_will_do() -> None:
    async def scenario() -> None:
        port = PacedFake(FakeBoard(name="bench-1"))
        link = Link(ThreadedChannel("/dev/ttyACM0", port))
        await link.open()
        await link.request(CURRENT_1A)
        await link.request(m.Enable())
        await link.request(m.GetStatus())
        port.gone = True
        try:
            await link.next_push(5)
        finally:
            link.close()

    with pytest.raises(LinkLost) as caught:
        asyncio.run(scenario())
    told = str(caught.value)
    assert "/dev/ttyACM0: the connection to the board broke" in told
    assert "The load was sinking 1.000 A at 12.000 V when it was last heard, 0." in told
    assert "the board turns it off by itself 3 s after the last command that reached it" in told
    assert "pull the source lead" in told


def test_a_load_that_was_off_is_told_as_off() -> None:
    board = FakeBoard()
    link = _linked(board)
    drive(link.request(m.Disable()))
    board.silent = True
    with pytest.raises(
        LinkLost, match=r"The load was off when it was last heard, .* nothing turns it on by itself"
    ):
        drive(link.request(m.GetStatus()))


def test_a_load_that_was_told_to_turn_on_and_did_not_answer_is_never_told_as_off() -> None:
    board = FakeBoard()
    link = _linked(board)
    drive(link.request(CURRENT_1A))
    drive(link.request(m.GetStatus()))
    board.lose_replies = 3
    with pytest.raises(LinkLost, match=r"The load may be on.*turns it off by itself 3 s after"):
        drive(link.request(m.Enable()))


def test_a_fault_that_off_cannot_end_is_never_told_as_off() -> None:
    board = FakeBoard()
    channel = LockStepFake(board)
    link = Link(channel)
    drive(link.open())
    channel.pending += board.trip(Fault.CURRENT_ALTHOUGH_OFF, 900_000, 60_000)
    assert isinstance(drive(link.next_push(0.1)), m.Event)
    board.silent = True
    with pytest.raises(LinkLost, match="pull the source lead now"):
        drive(link.request(m.GetStatus()))


def test_a_board_that_restarted_is_noticed_at_the_next_command() -> None:
    board = FakeBoard()
    link = _linked(board)
    board.restart()
    with pytest.raises(LinkLost, match=r"the board has restarted.*the load is off"):
        drive(link.request(CURRENT_1A))
    assert board.acted == []


def test_a_board_that_tells_of_its_restart_is_believed_at_once() -> None:
    board = FakeBoard()
    channel = LockStepFake(board)
    link = Link(channel)
    drive(link.open())
    drive(link.pause(2))
    drive(link.request(m.GetStatus()))
    board.time_us = 1000
    channel.pending += board.event(EventKind.BOOT, 2)
    with pytest.raises(LinkLost, match="the board has restarted"):
        drive(link.next_push(0.1))


def test_the_first_start_told_after_the_greeting_is_no_restart() -> None:
    board = FakeBoard()
    channel = LockStepFake(board)
    link = Link(channel)
    drive(link.open())
    channel.pending += board.event(EventKind.BOOT, 1)
    assert isinstance(drive(link.next_push(0.1)), m.Event)
