"""The board's end of the framing, run by the board's own interpreter."""

from __future__ import annotations

import json
import random
import zlib
from textwrap import dedent
from typing import Any

import pytest

from sinkwright_wire.framing import Deframer, Frame, encode_frame
from sinkwright_wire.messages import pack
from tests.support.golden_frames import GOLDEN_FILE, golden_frames
from tests.support.micropython import run_micropython

_PRELUDE = """
import binascii, gc, json, micropython, struct
import wire
from link import Link


class Stream:
    '''Hands out what was put in, at most `step` octets a read, and takes what there is room for.'''

    def __init__(self, arriving=b"", step=1000, room=1000):
        self.arriving = arriving
        self.step = step
        self.free = room
        self.written = b""

    def read_into(self, buffer):
        count = min(len(buffer), self.step, len(self.arriving))
        if count:
            buffer[:count] = self.arriving[:count]
            self.arriving = self.arriving[count:]
        return count

    def room(self):
        return self.free

    def write(self, view):
        self.written += bytes(view)
        self.free -= len(view)
        return len(view)


def received(arriving, step=1000, polls=1000):
    '''The contents that come out, and what was discarded.'''
    link = Link(Stream(arriving, step))
    contents = [link.poll() for _ in range(polls)]
    return [hexed(content) for content in contents if content is not None], link.discarded


def hexed(octets):
    return binascii.hexlify(octets).decode()


def sent(message, session, sequence, payload):
    stream = Stream()
    assert Link(stream).send(message, session, sequence, payload)
    return stream.written
"""

CONTENT = b"\x01\x05\x09\x00\x02\x00\x05\x7e\x7d\x03\x23\x5d"
FRAME = encode_frame(CONTENT)
OTHER = encode_frame(b"\x01\x0e\x09\x00\x03\x00\x00")


def on_link(lines: str, **given: Any) -> Any:
    """Carry out `lines` with `given` under MicroPython and return `found`."""
    named = "".join(f"{name} = {value!r}\n" for name, value in given.items())
    return json.loads(run_micropython(_PRELUDE + named + dedent(lines) + "\nprint(json.dumps(found))\n"))


# Golden frames


def test_the_board_produces_every_golden_frame_from_its_own_formats():
    found = on_link(
        """
        ENTRIES = {
            "entries": "LOG_ENTRY_FORMAT",
            "steps": "PROGRAM_STEP_FORMAT",
            "readings": "BURST_READING_FORMAT",
        }
        found = []
        with open(golden) as file:
            frames = json.load(file)["frames"]
        for entry in frames:
            name = "".join("_" + sign if sign.isupper() else sign for sign in entry["message"])[1:].upper()
            values, tail = [], b""
            for field, value in entry["fields"]:
                if isinstance(value, dict):
                    values.append(binascii.unhexlify(value["hex"]))
                elif isinstance(value, list):
                    tail = b"".join(struct.pack(getattr(wire, ENTRIES[field]), *one) for one in value)
                elif field == "text":
                    tail = value.encode()
                else:
                    values.append(value.encode() if isinstance(value, str) else value)
            payload = struct.pack(getattr(wire, name + "_FORMAT"), *values) + tail
            found.append(hexed(sent(getattr(wire, name), entry["session"], entry["sequence"], payload)))
        """,
        golden=str(GOLDEN_FILE),
    )

    assert found == [golden.frame.hex() for golden in golden_frames()]


def test_the_board_accepts_every_golden_frame():
    frames = golden_frames()

    contents, discarded = on_link(
        "found = received(arriving)", arriving=b"".join(one.frame for one in frames)
    )

    assert contents == [pack(one.message, one.session, one.sequence).hex() for one in frames]
    assert discarded == 0


def test_what_the_board_sends_the_host_accepts_and_the_other_way_round():
    dice = random.Random(7)
    payloads = [
        bytes(dice.choices(b"\x7e\x7d\x03\x23\x5d\x5e\x00\xff", k=dice.randrange(113))) for _ in range(100)
    ]
    host = [encode_frame(b"\x01\x40\x00\x00\x00\x00" + bytes([len(one)]) + one) for one in payloads]

    frames, accepted = on_link(
        """
        frames = [sent(wire.TELEMETRY, 0, 0, payload) for payload in payloads]
        found = [hexed(frame) for frame in frames], received(host)
        """,
        payloads=payloads,
        host=b"".join(host),
    )

    assert frames == [frame.hex() for frame in host]
    assert accepted == [[frame_content(frame).hex() for frame in host], 0]


def frame_content(frame: bytes) -> bytes:
    (found,) = Deframer().feed(frame)
    assert isinstance(found, Frame)
    return found.content


# Receiving


@pytest.mark.parametrize("step", [1, 2, 3, 7, 128, 1000])
def test_frames_may_arrive_in_pieces_of_any_size(step):
    contents, discarded = on_link("found = received(arriving, step)", arriving=(FRAME + OTHER) * 3, step=step)

    assert contents == [CONTENT.hex(), frame_content(OTHER).hex()] * 3
    assert discarded == 0


def test_two_frames_may_share_a_flag():
    contents, discarded = on_link("found = received(arriving)", arriving=FRAME[:-1] + OTHER)

    assert contents == [CONTENT.hex(), frame_content(OTHER).hex()]
    assert discarded == 0


def test_one_poll_gives_one_frame_and_looks_at_no_more_than_one_read():
    reads = on_link(
        """
        stream = Stream(arriving)
        link = Link(stream)
        left = []
        for _ in range(4):
            link.poll()
            left.append(len(stream.arriving))
        found = left
        """,
        arriving=b"\x00" * 1000,
    )

    assert reads == [1000 - 128 * polls for polls in (1, 2, 3, 4)]


@pytest.mark.parametrize(
    "garbage",
    [
        pytest.param(b"\x01\x02\x04", id="too short"),
        pytest.param(b"\x80" * 247, id="one octet too long"),
        pytest.param(b"\x80" * 5000, id="far too long"),
        pytest.param(FRAME[1:-2], id="the end is missing"),
        pytest.param(FRAME[3:-1], id="the start is missing"),
        pytest.param(FRAME[1:6] + b"\x03" + FRAME[6:-1], id="a bare 03"),
        pytest.param(FRAME[1:-1] + b"\x7d", id="an escape before the flag"),
        pytest.param(FRAME[1:-1].replace(b"\x01", b"\x7d\x21", 1), id="an escape outside the map"),
        pytest.param(FRAME[1:-1].replace(b"\x05", b"\x06", 1), id="a wrong octet"),
        pytest.param("Fühler 1".encode("latin-1"), id="text that is not UTF-8"),
    ],
)
def test_what_is_no_frame_is_discarded_and_counted_and_the_next_frame_is_taken(garbage):
    for step in (1, 1000):
        contents, discarded = on_link(
            "found = received(arriving, step, 7000)", arriving=garbage + FRAME + OTHER, step=step
        )

        assert contents == [CONTENT.hex(), frame_content(OTHER).hex()]
        assert discarded == 1


def test_typed_text_is_ignored_and_not_counted():
    contents, discarded = on_link(
        "found = received(arriving)", arriving="help?\r\n\tgrüezi {}".encode() + FRAME + b"bye\n" + OTHER
    )

    assert contents == [CONTENT.hex(), frame_content(OTHER).hex()]
    assert discarded == 0


def test_no_frame_with_one_wrong_bit_yields_anything():
    found = on_link(
        """
        found = []
        for at in range(len(frame)):
            for bit in range(8):
                wrong = bytearray(frame)
                wrong[at] ^= 1 << bit
                found += received(b"~" + wrong + b"~", 1000, 6)[0]
        """,
        frame=max((golden.frame for golden in golden_frames()), key=len),
    )

    assert found == []


def test_random_octets_yield_nothing_and_never_raise():
    dice = random.Random(1662)
    noise = dice.randbytes(20_000) + bytes(dice.choices(b"\x7e\x7d\x03\x5e\x41", k=20_000))

    contents, discarded = on_link("found = received(arriving, 1000, 6000)", arriving=noise + FRAME)

    assert contents == [CONTENT.hex()]
    assert discarded > 1000


def test_the_board_checks_like_rfc_1662():
    """RFC 1662 appendix C.3: the good final FCS is DEBB20E3; the board compares with its complement."""
    complement = on_link("import link\nfound = link._GOOD")

    assert complement ^ 0xFFFFFFFF == 0xDEBB20E3
    assert zlib.crc32(CONTENT + zlib.crc32(CONTENT).to_bytes(4, "little")) == complement


def test_an_idle_poll_allocates_nothing():
    found = on_link(
        """
        link = Link(Stream())
        link.poll()
        micropython.heap_lock()
        before = micropython.mem_total()
        for _ in range(100):
            link.poll()
        grown = micropython.mem_total() - before
        micropython.heap_unlock()
        found = grown
        """
    )

    assert found == 0


def test_garbage_does_not_make_the_link_grow():
    found = on_link(
        """
        stream = Stream()
        link = Link(stream)
        stuff = garbage
        kept = []
        for _ in range(5):
            for _ in range(200):
                stream.arriving = stuff
                while link.poll() is not None or stream.arriving:
                    pass
                link.send(wire.TELEMETRY, 0, 0, stuff[:80])
                stream.written, stream.free = b"", 1000
            gc.collect()
            kept.append(gc.mem_alloc())
        found = [kept[-1] - kept[1], link.discarded]
        """,
        garbage=b"\x80" * 300 + FRAME + b"\x7d\x7e\x03" + b"plain words\x7e" * 3,
    )

    grown, discarded = found
    assert grown <= 0
    assert discarded > 1000


# Sending


@pytest.mark.parametrize(("missing", "written"), [(0, True), (1, False)])
def test_a_frame_is_written_only_if_there_is_room_for_all_of_it(missing, written):
    payload = b"\x7e\x7d\x03" * 20
    whole = len(encode_frame(b"\x01\x40\x00\x00\x00\x00" + bytes([len(payload)]) + payload))

    told, octets = on_link(
        """
        stream = Stream(room=room)
        found = [Link(stream).send(wire.TELEMETRY, 0, 0, payload), len(stream.written)]
        """,
        payload=payload,
        room=whole - missing,
    )

    assert told is written
    assert octets == (whole if written else 0)


def test_without_any_room_sending_returns_at_once():
    assert on_link("found = Link(Stream(room=0)).send(wire.DONE, 1, 2, bytes(1))") is False


def test_the_longest_frame_of_nothing_but_stuffed_octets_fits_and_comes_back():
    frame, accepted = on_link(
        """
        frame = sent(0x7E, 0x7E7D, 0x0303, bytes([0x7D]) * wire.MAX_PAYLOAD)
        found = [hexed(frame), received(frame)]
        """
    )

    assert len(frame) // 2 < 256
    assert "03" not in [frame[at : at + 2] for at in range(0, len(frame), 2)]
    assert accepted == [[frame_content(bytes.fromhex(frame)).hex()], 0]
