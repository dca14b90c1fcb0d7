"""Frames against RFC 1662 and the CRC catalogue, however the bytes arrive and whatever lies between them."""

from __future__ import annotations

import csv
import random
import zlib
from itertools import pairwise
from pathlib import Path

import crcmod.predefined
import pytest
from hypothesis import given
from hypothesis import strategies as st

from sinkwright_wire.framing import Deframer, Discard, Frame, Reason, Text, encode_frame, fcs_register
from sinkwright_wire.messages import pack
from tests.support.golden_frames import golden_frames
from tests.support.messages import any_message
from tests.support.micropython import run_micropython

CRC_FILE = Path(__file__).resolve().parents[1] / "data" / "crc.csv"

CONTENTS = st.binary(min_size=7, max_size=119)


def catalogue(name: str) -> int:
    """The check value for "123456789", after the public CRC catalogue."""
    lines = [line for line in CRC_FILE.read_text(encoding="utf-8").splitlines() if not line.startswith("#")]
    return next(int(row["check_hex"], 16) for row in csv.DictReader(lines) if row["name"] == name)


def contents(found) -> list[bytes]:
    return [item.content for item in found if isinstance(item, Frame)]


# The check sequence


def test_the_check_value_is_that_of_the_crc_catalogue():
    assert catalogue("CRC-32/ISO-HDLC") == 0xCBF43926
    assert fcs_register(b"123456789") ^ 0xFFFFFFFF == 0xCBF43926


@given(st.binary(max_size=300))
def test_a_content_with_its_check_sequence_ends_at_the_good_final_fcs_of_rfc_1662(content):
    """RFC 1662 appendix C.3: PPPGOODFCS32 is 0xdebb20e3."""
    checked = content + zlib.crc32(content).to_bytes(4, "little")

    assert fcs_register(checked) == 0xDEBB20E3


@given(st.binary(max_size=300))
def test_crcmod_agrees_with_zlib(data):
    assert crcmod.predefined.mkCrcFun("crc-32")(data) == zlib.crc32(data)


def test_the_board_agrees_with_crcmod_and_zlib():
    dice = random.Random(1662)
    blocks = [dice.randbytes(dice.randrange(150)) for _ in range(300)] + [b"123456789"]
    script = "import binascii\nfor block in " + repr([block.hex() for block in blocks])
    script += ":\n    print(binascii.crc32(binascii.unhexlify(block)))\n"

    printed = [int(line) for line in run_micropython(script).split()]

    assert printed == [zlib.crc32(block) for block in blocks]
    assert printed == [crcmod.predefined.mkCrcFun("crc-32")(block) for block in blocks]


# Good frames


@pytest.mark.parametrize("golden", golden_frames(), ids=lambda golden: golden.title)
def test_a_golden_frame_is_what_the_host_frames_and_unframes(golden):
    content = pack(golden.message, golden.session, golden.sequence)

    assert encode_frame(content) == golden.frame
    assert Deframer().feed(golden.frame) == [Frame(content)]


@given(CONTENTS)
def test_a_frame_holds_no_interrupt_and_no_flag_inside_and_fits_a_usb_buffer(content):
    frame = encode_frame(content)

    assert b"\x03" not in frame
    assert frame[:1] == frame[-1:] == b"\x7e"
    assert b"\x7e" not in frame[1:-1]
    assert len(frame) < 256


@pytest.mark.parametrize("octet", [0x7E, 0x7D, 0x03])
def test_a_content_of_nothing_but_stuffed_octets_survives(octet):
    content = bytes([octet]) * 119

    assert Deframer().feed(encode_frame(content)) == [Frame(content)]


@given(st.lists(CONTENTS, min_size=1, max_size=5))
def test_frames_survive_whole_and_a_byte_at_a_time(several):
    stream = b"".join(map(encode_frame, several))
    slow = Deframer()

    assert contents(Deframer().feed(stream)) == several
    assert contents(item for at in range(len(stream)) for item in slow.feed(stream[at : at + 1])) == several
    assert (slow.frames, slow.discarded, slow.texts) == (len(several), 0, 0)


@given(CONTENTS, st.binary(max_size=60))
def test_garbage_after_a_frame_changes_nothing(content, garbage):
    assert contents(Deframer().feed(encode_frame(content) + garbage))[:1] == [content]


@given(CONTENTS, st.binary(max_size=400))
def test_garbage_before_a_frame_costs_no_frame(content, garbage):
    assert contents(Deframer().feed(garbage + encode_frame(content)))[-1] == content


@given(any_message(), st.lists(st.integers(0, 300), max_size=6))
def test_a_frame_may_be_cut_anywhere(message, cuts):
    frame = encode_frame(pack(message))
    deframer = Deframer()
    bounds = sorted({0, len(frame), *(cut % len(frame) for cut in cuts)})

    found = [item for start, end in pairwise(bounds) for item in deframer.feed(frame[start:end])]

    assert found == [Frame(pack(message))]


def test_two_frames_may_share_a_flag():
    first, second = encode_frame(b"first frame"), encode_frame(b"second frame")

    assert contents(Deframer().feed(first + second[1:])) == [b"first frame", b"second frame"]


def test_flags_in_a_row_are_nothing():
    deframer = Deframer()

    assert deframer.feed(b"\x7e" * 10) == []
    assert deframer.discarded == 0


# What is not a frame


@pytest.mark.parametrize("golden", golden_frames(), ids=lambda golden: golden.title)
def test_no_frame_with_one_wrong_bit_yields_anything(golden):
    for at in range(len(golden.frame)):
        for bit in range(8):
            wrong = bytearray(golden.frame)
            wrong[at] ^= 1 << bit
            assert contents(Deframer().feed(b"\x7e" + bytes(wrong) + b"\x7e")) == []


@given(any_message(), st.data())
def test_a_corrupted_frame_never_yields_a_message(message, data):
    frame = bytearray(encode_frame(pack(message)))
    for at in data.draw(st.lists(st.integers(1, len(frame) - 2), min_size=1, max_size=8, unique=True)):
        frame[at] = data.draw(st.integers(0, 255).filter(lambda value, at=at: value != frame[at]))

    assert contents(Deframer().feed(bytes(frame))) == []


@pytest.mark.parametrize(
    ("inside", "reason"),
    [
        (b"\x01\x80", Reason.TOO_SHORT),
        (b"\x01" * 300, Reason.TOO_LONG),
        (b"\x01\x02\x04\x05\x06\x07\x08\x09\x0a\x0b\x0c\x0d", Reason.BAD_CHECK),
        (b"\x01\x7d\x41\x04\x05\x06\x07\x08\x09\x0a\x0b\x0c", Reason.BAD_ESCAPE),
        (b"\x01\x7d\x7d\x5d\x05\x06\x07\x08\x09\x0a\x0b\x0c", Reason.BAD_ESCAPE),
        (b"\x01\x04\x05\x06\x07\x08\x09\x0a\x0b\x0c\x0d\x7d", Reason.BAD_ESCAPE),
        (b"\x01\x03\x04\x05\x06\x07\x08\x09\x0a\x0b\x0c\x0d", Reason.INTERRUPT_INSIDE),
    ],
)
def test_what_is_no_frame_is_discarded_with_its_reason_and_counted(inside, reason):
    deframer = Deframer()

    assert deframer.feed(b"\x7e" + inside + b"\x7e") == [Discard(reason, len(inside))]
    assert (deframer.frames, deframer.discarded) == (0, 1)


def test_escapes_outside_the_map_are_not_undone():
    """RFC 1662 lets a receiver undo any escape; our map is exact, so 7D 21 is damage and not 01."""
    content = b"\x01ten octets"
    frame = encode_frame(content)

    assert frame[1:2] == b"\x01"
    assert contents(Deframer().feed(frame.replace(b"\x01", b"\x7d\x21", 1))) == []


def test_a_line_between_frames_is_told_as_text():
    deframer = Deframer()
    frame = encode_frame(b"\x01 a content")

    found = deframer.feed(frame + "heatsink 31 °C {'fan': 1}\r\n".encode() + frame)

    assert found == [
        Frame(b"\x01 a content"),
        Text("heatsink 31 °C {'fan': 1}\r\n"),
        Frame(b"\x01 a content"),
    ]
    assert deframer.texts == 1


def test_the_last_words_of_a_crashed_firmware_can_be_read():
    deframer = Deframer()

    deframer.feed(encode_frame(b"\x01 a content") + b"Traceback (most recent call last):\r\n")

    assert deframer.unfinished == b"Traceback (most recent call last):\r\n"


def test_an_endless_stream_without_flags_is_bounded_and_counted_once():
    deframer = Deframer()
    for _ in range(1000):
        assert deframer.feed(bytes(1000)) == []
    assert len(deframer.unfinished) <= 4096

    assert deframer.feed(b"\x7e") == [Discard(Reason.TOO_LONG, 1_000_000)]
    assert contents(deframer.feed(encode_frame(b"\x01 a content"))) == [b"\x01 a content"]


@given(st.binary(max_size=500))
def test_no_bytes_at_all_raise(data):
    deframer = Deframer()

    found = deframer.feed(data)

    assert deframer.frames + deframer.discarded + deframer.texts == len(found)
