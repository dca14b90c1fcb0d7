"""Octet-stuffed framing after RFC 1662, with FCS-32: bytes in, frames out, whatever lies between them.

Flag 7E, escape 7D, and one octet in the map besides these two: 03, so that a frame never contains Ctrl-C
and a board keeps its interpreter's interrupt. What a frame's content means is not decided here.
firmware/link.py is the other end and is written by hand; golden frames in the tests hold the two together.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from enum import StrEnum

from crcmod.predefined import mkCrcFun

from .layouts import HEADER, MAX_PAYLOAD

FLAG = b"\x7e"
ESCAPE = b"\x7d"
INTERRUPT = b"\x03"
# RFC 1662 section 4.2: the escape octet, then the octet exclusive-or 20. The escape octet comes first,
# because the others bring escapes of their own; on the way back it comes last.
ESCAPED: dict[bytes, bytes] = {ESCAPE: b"\x7d\x5d", FLAG: b"\x7d\x5e", INTERRUPT: b"\x7d\x23"}

FCS_SIZE = 4
# RFC 1662 appendix C.3: the register after a good frame with its own check sequence.
GOOD_FINAL_FCS = 0xDEBB20E3

_SHORTEST = HEADER.sizeof() + FCS_SIZE
_LONGEST_STUFFED = 2 * (HEADER.sizeof() + MAX_PAYLOAD + FCS_SIZE)
# A board in trouble prints a traceback between two flags; this much of it is kept together.
_LONGEST_TEXT = 4096

_crc32 = mkCrcFun("crc-32")


class Reason(StrEnum):
    """Why bytes between two flags were neither a frame nor text."""

    TOO_SHORT = "too short for a frame"
    TOO_LONG = "too long for a frame"
    BAD_ESCAPE = "an escape that the map does not know"
    INTERRUPT_INSIDE = "a bare 03 inside a frame"
    BAD_CHECK = "the check sequence does not fit"


@dataclass(frozen=True, slots=True)
class Frame:
    """The header and payload of a frame whose check sequence was good."""

    content: bytes


@dataclass(frozen=True, slots=True)
class Text:
    """Printable UTF-8 between flags: something the firmware printed."""

    text: str


@dataclass(frozen=True, slots=True)
class Discard:
    """Bytes that were thrown away, and why."""

    reason: Reason
    length: int


def fcs_register(data: bytes) -> int:
    """The FCS-32 register after `data`, before the complement that is sent."""
    return _crc32(data) ^ 0xFFFFFFFF


def encode_frame(content: bytes) -> bytes:
    """A frame with both flags around header and payload, check sequence added."""
    stuffed = content + _crc32(content).to_bytes(FCS_SIZE, "little")
    for octet, escaped in ESCAPED.items():
        stuffed = stuffed.replace(octet, escaped)
    return FLAG + stuffed + FLAG


def _unstuff(segment: bytes) -> bytes | None:
    """What was stuffed, or None where an escape is not of our map."""
    escapes = segment.count(ESCAPE)
    if escapes != sum(segment.count(escaped) for escaped in ESCAPED.values()):
        return None
    if escapes:
        for octet, escaped in reversed(ESCAPED.items()):
            segment = segment.replace(escaped, octet)
    return segment


def _frame_or_reason(segment: bytes) -> Frame | Reason:
    if len(segment) > _LONGEST_STUFFED:
        return Reason.TOO_LONG
    if INTERRUPT in segment:
        return Reason.INTERRUPT_INSIDE
    content = _unstuff(segment)
    if content is None:
        return Reason.BAD_ESCAPE
    if len(content) < _SHORTEST:
        return Reason.TOO_SHORT
    if fcs_register(content) != GOOD_FINAL_FCS:
        return Reason.BAD_CHECK
    return Frame(content[:-FCS_SIZE])


def _as_text(segment: bytes) -> str | None:
    """The segment as text, if it is UTF-8 without control characters but line ends and tabs."""
    try:
        text = segment.decode("utf-8")
    except UnicodeDecodeError:
        return None
    return text if all(sign.isprintable() or sign in "\t\r\n" for sign in text) else None


class Deframer:
    """Takes bytes as they come and gives back what they hold. It keeps a bounded number of them."""

    def __init__(self) -> None:
        self.frames = 0
        self.discarded = 0
        self.texts = 0
        self._segment = bytearray()
        self._surplus = 0

    @property
    def unfinished(self) -> bytes:
        """What came since the last flag; after a crash of the firmware, its last words."""
        return bytes(self._segment)

    def feed(self, data: bytes) -> list[Frame | Text | Discard]:
        """The frames, texts and discards that `data` completes."""
        first, *others = data.split(FLAG)
        self._gather(first)
        found = []
        for part in others:
            found.extend(self._close())
            self._gather(part)
        return found

    def _gather(self, part: bytes) -> None:
        room = _LONGEST_TEXT - len(self._segment)
        self._segment += part[:room]
        self._surplus += max(0, len(part) - room)

    def _close(self) -> Iterator[Frame | Text | Discard]:
        """What the segment is that a flag has just ended; nothing for an empty one (RFC 1662 section 3.1)."""
        segment = bytes(self._segment)
        surplus = self._surplus
        self._segment.clear()
        self._surplus = 0
        if not segment:
            return
        outcome = _frame_or_reason(segment)
        if isinstance(outcome, Frame):
            self.frames += 1
            yield outcome
            return
        text = _as_text(segment) if not surplus else None
        if text is None:
            self.discarded += 1
            yield Discard(outcome, len(segment) + surplus)
        else:
            self.texts += 1
            yield Text(text)
