"""Messages check themselves, survive the way to bytes and back, and nothing else comes out of bytes."""

from __future__ import annotations

import dataclasses
import struct
import zlib

import pytest
from hypothesis import given
from hypothesis import strategies as st

from sinkwright_wire import messages
from sinkwright_wire.errors import (
    BadField,
    Malformed,
    UnknownMessage,
    UnknownValue,
    VersionMismatch,
    WireError,
)
from sinkwright_wire.layouts import MAX_PAYLOAD
from sinkwright_wire.messages import MESSAGES, Hello, HelloReply, LogEntries, LogEntry, Request, pack, parse
from sinkwright_wire.vocabulary import Fault, LimitField, Mode, Refusal, State
from tests.support.golden_frames import golden_frames
from tests.support.messages import NUMBERS_16, any_message

LOG_ENTRY = LogEntry(1, 2, 3, 4, 5, 6, 7)


def content(message_id: int, payload: bytes, version: int = 1) -> bytes:
    """A content made without the package."""
    return struct.pack("<BBHHB", version, message_id, 9, 5, len(payload)) + payload


@given(any_message(), NUMBERS_16, NUMBERS_16)
def test_every_message_survives_the_way_to_bytes_and_back(message, session, sequence):
    envelope = parse(pack(message, session, sequence))

    assert envelope.message == message
    assert (envelope.version, envelope.id) == (1, message.ID)
    assert (envelope.session, envelope.sequence) == (session, sequence)


@given(any_message())
def test_no_payload_is_longer_than_a_frame_may_carry(message):
    assert len(pack(message)) <= 7 + MAX_PAYLOAD


@given(any_message(), st.binary(min_size=1, max_size=30))
def test_surplus_bytes_are_not_taken_for_a_message(message, surplus):
    whole = pack(message)

    with pytest.raises(WireError):
        parse(whole + surplus)


@given(any_message(), st.integers(1, 200))
def test_a_message_cut_short_is_not_taken_for_one(message, missing):
    with pytest.raises(WireError):
        parse(pack(message)[:-missing])


@given(st.binary(max_size=140))
def test_any_bytes_lead_to_a_message_or_to_our_own_error(data):
    for start in (b"", struct.pack("<BBHHB", 1, data[0] if data else 0, 0, 0, len(data))):
        try:
            parse(start + data)
        except WireError:
            continue


@pytest.mark.parametrize("message_id", sorted(MESSAGES))
@given(payload=st.binary(max_size=MAX_PAYLOAD))
def test_any_payload_leads_to_a_message_or_to_our_own_error(message_id, payload):
    try:
        envelope = parse(content(message_id, payload))
    except WireError:
        return
    assert pack(envelope.message, 9, 5) == content(message_id, payload)


def test_every_message_has_a_golden_frame():
    assert {type(golden.message) for golden in golden_frames()} == set(MESSAGES.values())


@pytest.mark.parametrize("golden", golden_frames(), ids=lambda golden: golden.title)
def test_a_golden_frame_is_what_the_host_packs_and_parses(golden):
    stuffed = golden.frame[1:-1]
    plain = stuffed.replace(b"\x7d\x5e", b"\x7e").replace(b"\x7d\x23", b"\x03").replace(b"\x7d\x5d", b"\x7d")
    inside, fcs = plain[:-4], plain[-4:]

    assert zlib.crc32(inside) == int.from_bytes(fcs, "little")
    assert pack(golden.message, golden.session, golden.sequence) == inside
    assert parse(inside).message == golden.message


def test_ids_keep_to_their_ranges():
    for message_id, message in MESSAGES.items():
        if issubclass(message, Request):
            assert 0x01 <= message_id <= 0x3F
            assert message.REPLY.ID in (message_id | 0x80, messages.Done.ID)
        elif issubclass(message, messages.Push):
            assert 0x40 <= message_id <= 0x5F
        else:
            assert message_id >= 0x80


def test_a_message_cannot_be_changed():
    with pytest.raises(dataclasses.FrozenInstanceError):
        Hello().watch = True  # pyright: ignore[reportAttributeAccessIssue]


@pytest.mark.parametrize(
    ("cls", "fields", "named"),
    [
        (messages.SetPoint, {"mode": Mode.CURRENT, "value": 1 << 31}, "value"),
        (messages.SetPoint, {"mode": Mode.CURRENT, "value": 1.5}, "value"),
        (messages.SetPoint, {"mode": Mode.CURRENT, "value": True}, "value"),
        (messages.SetPoint, {"mode": 1, "value": 0}, "mode"),
        (messages.SetTelemetry, {"every_steps": -1}, "every_steps"),
        (messages.SetTelemetry, {"every_steps": 65536}, "every_steps"),
        (messages.Hello, {"watch": 1}, "watch"),
        (messages.LogLine, {"level": 20, "text": "é" * 51}, "text"),
        (messages.LogLine, {"level": 20, "text": "a\0b"}, "text"),
        (messages.LogLine, {"level": 20, "text": "half a pair: \ud800"}, "text"),
        (
            messages.LogEntries,
            {"first": 0, "total": 5, "spacing_ms": 1000, "entries": (LOG_ENTRY,) * 5},
            "entries",
        ),
        (
            messages.LogEntries,
            {"first": 0, "total": 5, "spacing_ms": 1000, "entries": [LOG_ENTRY]},
            "entries",
        ),
    ],
)
def test_a_field_that_does_not_fit_is_refused_by_name(cls, fields, named):
    with pytest.raises(BadField, match=rf"^{cls.__name__}\.{named} is ") as caught:
        cls(**fields)
    assert caught.value.field == named


@pytest.mark.parametrize("session", [-1, 65536])
def test_a_session_beyond_16_bits_is_refused(session):
    with pytest.raises(BadField):
        pack(Hello(), session)


def test_a_number_that_stands_for_nothing_is_refused():
    payload = struct.pack("<BBBi", 5, 200, 0, 0)

    with pytest.raises(UnknownValue) as caught:
        parse(content(0xC1, payload))
    assert (caught.value.field, caught.value.value) == ("refusal", 200)


def test_a_flag_other_than_0_or_1_is_refused():
    with pytest.raises(UnknownValue):
        parse(content(0x01, b"\x01\x02"))


def test_an_unknown_id_is_refused():
    with pytest.raises(UnknownMessage) as caught:
        parse(content(0x3F, b""))
    assert caught.value.message_id == 0x3F


def test_text_that_is_not_utf8_is_refused():
    with pytest.raises(Malformed, match="UTF-8"):
        parse(content(0x41, b"\x14\xff\xfe"))


def test_another_wire_version_is_told_and_not_read():
    with pytest.raises(VersionMismatch) as caught:
        parse(content(0xC0, b"\x01", version=2))
    assert caught.value.version == 2


def test_hello_is_read_in_every_version():
    reply = HelloReply(2, False, 0, 9, 0, 77, bytes(8), "later", False, 0)
    of_version_2 = b"\x02" + pack(reply)[1:]

    assert parse(of_version_2).message == reply
    assert parse(content(0x01, b"\x02\x00", version=2)).message == Hello(2, False)


def test_a_piece_of_the_log_may_be_empty_or_full():
    for count in (0, 4):
        piece = LogEntries(0, 4, 1000, (LOG_ENTRY,) * count)
        assert parse(pack(piece)).message == piece


def test_half_a_log_entry_is_refused():
    whole = pack(LogEntries(0, 1, 1000, (LOG_ENTRY,)))[7:]

    with pytest.raises(Malformed):
        parse(content(0x8D, whole[:-1]))


def test_every_word_has_its_sentence():
    for words in (State, Mode, Fault, Refusal):
        for word in words:
            assert word.sentence.endswith(".")
            assert word.sentence[0].isupper()


def test_faults_tell_the_unit_of_their_reading():
    assert Fault.HEATSINK_HOT.unit == "mC"
    assert Fault.OVER_POWER.unit == "uW"
    assert Fault.EXCEPTION.unit == ""


def test_a_limit_field_is_the_position_of_its_limit():
    names = [field.name for field in dataclasses.fields(messages.Limits)]

    assert [field.sentence for field in LimitField if field] == names
    assert [int(field) for field in LimitField] == list(range(len(names) + 1))
