"""The host's side of the conversation, driven by answers that are made here."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from sinkwright_wire.conversation import (
    RULES,
    Arrival,
    BoardRestarted,
    Conversation,
    Discarded,
    Push,
    RefusedReply,
    Reply,
    StaleReply,
    TelemetryGap,
    TextLine,
    Turn,
    WrongVersion,
)
from sinkwright_wire.errors import BadField, OutOfTurn
from sinkwright_wire.framing import Deframer, Frame, encode_frame
from sinkwright_wire.messages import (
    Beat,
    Disable,
    Done,
    Event,
    GetStatus,
    Hello,
    HelloReply,
    Refused,
    SetPoint,
    Telemetry,
    pack,
    parse,
)
from sinkwright_wire.vocabulary import EventKind, Fault, LimitField, Limiting, Mode, Refusal, State

SESSION = 0x1234


def sent(data: bytes):
    """The envelope of the one frame in `data`."""
    (frame,) = Deframer().feed(data)
    assert isinstance(frame, Frame)
    return parse(frame.content)


def answer(message, session: int, sequence: int) -> bytes:
    return encode_frame(pack(message, session, sequence))


def hello_reply(boot_number: int = 77, wire_version: int = 1) -> HelloReply:
    return HelloReply(wire_version, True, 0, 1, 0, boot_number, bytes(8), "bench", True, 0xFFFFFFFF)


def telemetry(number: int) -> Telemetry:
    nothing = (0,) * 15
    return Telemetry(number, 0, State.SINKING, Mode.CURRENT, Limiting.NONE, Fault.NONE, *nothing)


def push(message) -> bytes:
    return encode_frame(pack(message))


@pytest.fixture
def conversation() -> Conversation:
    return Conversation(SESSION)


@pytest.fixture
def opened(conversation) -> Conversation:
    hello = sent(conversation.hello())
    conversation.receive(answer(hello_reply(), SESSION, hello.sequence))
    return conversation


def test_a_hello_carries_session_version_and_wish(conversation):
    envelope = sent(conversation.hello(watch=True))

    assert envelope.session == SESSION
    assert envelope.message == Hello(1, watch=True)


def test_a_request_is_answered(opened):
    envelope = sent(opened.request(SetPoint(Mode.CURRENT, 1_000_000)))
    assert opened.outstanding == SetPoint(Mode.CURRENT, 1_000_000)

    assert opened.receive(answer(Done(SetPoint.ID), SESSION, envelope.sequence)) == [Reply(Done(SetPoint.ID))]
    assert opened.outstanding is None


def test_a_refusal_frees_the_turn_and_tells_why(opened):
    envelope = sent(opened.request(SetPoint(Mode.CURRENT, 9_000_000)))
    refused = Refused(SetPoint.ID, Refusal.BEYOND_LIMIT, LimitField.CURRENT, 4_000_000)

    assert opened.receive(answer(refused, SESSION, envelope.sequence)) == [RefusedReply(refused)]
    assert opened.outstanding is None


def test_sequences_count_up_and_wrap(opened):
    first = sent(opened.request(Beat())).sequence
    opened.abandon()
    assert sent(opened.request(Beat())).sequence == first + 1

    opened.abandon()
    opened._sequence = 0xFFFF
    assert sent(opened.request(Beat())).sequence == 0


def test_a_retry_sends_the_same_bytes(opened):
    first = opened.request(GetStatus())

    assert opened.repeat() == first
    assert opened.repeat() == first


def test_both_answers_to_a_repeated_request_count_once(opened):
    envelope = sent(opened.request(Beat()))
    opened.repeat()
    done = answer(Done(Beat.ID), SESSION, envelope.sequence)

    first, second = opened.receive(done + done)

    assert first == Reply(Done(Beat.ID))
    assert isinstance(second, StaleReply)
    assert opened.stale_replies == 1


def test_nothing_can_be_repeated_without_a_request(opened):
    with pytest.raises(OutOfTurn):
        opened.repeat()


def test_a_second_request_must_wait_for_the_first(opened):
    opened.request(Beat())

    with pytest.raises(OutOfTurn, match="GetStatus was asked while Beat is outstanding"):
        opened.request(GetStatus())


def test_an_abandoned_request_makes_room_for_a_hello(opened):
    abandoned = sent(opened.request(Beat()))

    hello = sent(opened.hello())

    assert hello.sequence == abandoned.sequence + 1
    assert isinstance(opened.receive(answer(Done(Beat.ID), SESSION, abandoned.sequence))[0], StaleReply)
    assert opened.receive(answer(hello_reply(), SESSION, hello.sequence)) == [Reply(hello_reply())]


@pytest.mark.parametrize(
    ("message", "session", "ahead"),
    [
        (Done(Disable.ID), SESSION, -1),
        (Done(Disable.ID), SESSION, 1),
        (Done(Disable.ID), SESSION + 1, 0),
        (Done(Beat.ID), SESSION, 0),
        (Refused(Beat.ID, Refusal.NOT_OFFERED), SESSION, 0),
        (hello_reply(), SESSION, 0),
    ],
    ids=[
        "earlier",
        "later",
        "of another session",
        "done of another",
        "refusal of another",
        "of another kind",
    ],
)
def test_a_reply_that_is_not_the_one_awaited_is_dropped(opened, message, session, ahead):
    envelope = sent(opened.request(Disable()))

    (stale,) = opened.receive(answer(message, session, envelope.sequence + ahead))

    assert isinstance(stale, StaleReply)
    assert opened.outstanding == Disable()


def test_a_restarted_host_takes_no_reply_meant_for_its_forerunner():
    forerunner, successor = Conversation(100), Conversation(200)
    old = sent(forerunner.request(GetStatus()))
    new = sent(successor.request(GetStatus()))
    assert old.sequence == new.sequence

    (stale,) = successor.receive(answer(Refused(GetStatus.ID, Refusal.NO_SESSION), 100, old.sequence))

    assert isinstance(stale, StaleReply)


def test_pushes_pass_while_a_request_is_outstanding(opened):
    opened.request(Beat())
    event = Event(1, 5, EventKind.ENABLED, 1, 1_000_000)

    assert opened.receive(push(telemetry(1)) + push(event)) == [Push(telemetry(1)), Push(event)]
    assert opened.outstanding == Beat()


def test_missing_telemetry_is_told_before_the_next(opened):
    opened.receive(push(telemetry(10)))

    assert opened.receive(push(telemetry(11))) == [Push(telemetry(11))]
    assert opened.receive(push(telemetry(15))) == [TelemetryGap(12, 3), Push(telemetry(15))]
    assert opened.telemetry_missing == 3


def test_telemetry_numbers_wrap_without_a_gap(opened):
    opened.receive(push(telemetry(0xFFFFFFFF)))

    assert opened.receive(push(telemetry(0))) == [Push(telemetry(0))]


def test_a_damaged_telemetry_frame_shows_as_a_discard_and_a_gap(opened):
    damaged = bytearray(push(telemetry(2)))
    damaged[20] ^= 0x40

    found = opened.receive(push(telemetry(1)) + bytes(damaged) + push(telemetry(3)))

    assert [type(one) for one in found] == [Push, Discarded, TelemetryGap, Push]


def test_a_restart_of_the_board_is_told_by_its_boot_number(opened):
    opened.receive(push(telemetry(500)))
    hello = sent(opened.hello())

    found = opened.receive(answer(hello_reply(boot_number=78), SESSION, hello.sequence))

    assert found == [BoardRestarted(78), Reply(hello_reply(boot_number=78))]
    assert opened.receive(push(telemetry(900))) == [Push(telemetry(900))]


def test_a_hello_to_a_board_that_went_on_tells_no_restart(opened):
    hello = sent(opened.hello())

    assert opened.receive(answer(hello_reply(), SESSION, hello.sequence)) == [Reply(hello_reply())]


def test_telemetry_that_runs_backwards_is_no_gap(opened):
    opened.receive(push(telemetry(500)))

    assert opened.receive(push(telemetry(1))) == [Push(telemetry(1))]


def test_a_hello_answered_by_another_version_is_told(conversation):
    hello = sent(conversation.hello())

    found = conversation.receive(answer(hello_reply(wire_version=2), SESSION, hello.sequence))

    assert found == [WrongVersion(2)]
    assert conversation.outstanding is None


def test_a_frame_of_another_version_is_told_and_not_read(opened):
    opened.request(Beat())

    assert opened.receive(encode_frame(b"\x02" + pack(Done(Beat.ID), SESSION, 2)[1:])) == [WrongVersion(2)]
    assert opened.outstanding == Beat()


def test_printed_lines_are_told_one_by_one(opened):
    assert opened.receive(b"\x7efirst\r\n\r\nsecond\r\n\x7e") == [TextLine("first"), TextLine("second")]


def test_a_good_frame_that_is_no_message_is_discarded(opened):
    (discarded,) = opened.receive(encode_frame(b"\x01\x3f\x00\x00\x00\x00\x00"))

    assert discarded == Discarded("no message has the id 0x3F")


@pytest.mark.parametrize("session", [0, -1, 65536])
def test_a_session_that_the_header_cannot_tell_from_a_push_is_refused(session):
    with pytest.raises(BadField):
        Conversation(session)


def test_the_rules_cover_all_that_can_arrive():
    """An answer or a refusal needs an outstanding request; everything else may come at any time."""
    foreseen = {(turn, arrival) for turn in Turn for arrival in (Arrival.PUSH, Arrival.OTHER)}
    foreseen |= {(Turn.WAITING, Arrival.ANSWER), (Turn.WAITING, Arrival.REFUSAL)}

    assert set(RULES) == foreseen


@given(st.lists(st.sampled_from(["request", "answer", "stale", "push", "garbage", "abandon"]), max_size=30))
def test_no_order_of_things_raises_or_answers_twice(steps):
    conversation = Conversation(SESSION)
    asked = answered = 0
    sequence = 0
    for step in steps:
        found = []
        if step == "request" and conversation.outstanding is None:
            sequence = sent(conversation.request(Beat())).sequence
            asked += 1
        elif step == "answer":
            found = conversation.receive(answer(Done(Beat.ID), SESSION, sequence))
        elif step == "stale":
            found = conversation.receive(answer(Done(Beat.ID), SESSION, (sequence - 1) & 0xFFFF))
        elif step == "push":
            found = conversation.receive(push(Event(1, 2, EventKind.BOOT)))
        elif step == "garbage":
            found = conversation.receive(b"\x7e\x01\x7d\x03\xff\x7e")
        elif step == "abandon":
            conversation.abandon()
        answered += sum(isinstance(one, Reply) for one in found)
    assert answered <= asked
