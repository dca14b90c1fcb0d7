"""Frames over the board's byte stream, after RFC 1662: flags, byte stuffing and the check sequence.

What a frame means is not decided here; a frame that comes out of `poll` has a good check sequence and at
least a whole header. Nothing here ever waits: reading takes what is there, sending needs room for the whole
frame. Buffers are bounded and made once. Runs between control steps and may allocate.
"""

import binascii
import struct

from micropython import const

import wire

_FLAG = b"\x7e"
_ESCAPE = b"\x7d"
# Octets that must not appear in a frame, and what stands for them (RFC 1662 section 4.2: 7D, then the octet
# exclusive-or 20). 03 is in the map because a terminal's Ctrl-C must always mean Ctrl-C and never occur by
# chance.
_STUFFED_ESCAPE = b"\x7d\x5d"
_STUFFED_FLAG = b"\x7d\x5e"
_INTERRUPT = b"\x03"
_STUFFED_INTERRUPT = b"\x7d\x23"

_FCS = const(4)
_SHORTEST = const(11)  # a header and the check sequence
_LONGEST = const(246)  # header, payload and check sequence with every octet stuffed
_CHUNK = const(128)
# CRC-32 over a content with its own check sequence: the complement of RFC 1662's good final FCS, DEBB20E3.
_GOOD = 0x2144DF1C


class Link:
    """Frames in and out. `discarded` counts what was neither a good frame nor text."""

    def __init__(self, stream):
        self._read_into = stream.read_into
        self._room = stream.room
        self._write = stream.write
        self._chunk = bytearray(_CHUNK)
        self._chunk_view = memoryview(self._chunk)
        self._at = 0
        self._filled = 0
        self._segment = bytearray(_LONGEST)
        self._segment_view = memoryview(self._segment)
        self._length = 0
        self.discarded = 0

    def poll(self):
        """The next good frame's header and payload, or None. Looks at no more than one chunk of octets."""
        if self._at == self._filled:
            self._at = 0
            self._filled = self._read_into(self._chunk)
            if not self._filled:
                return None
        while self._at < self._filled:
            flag = self._chunk.find(_FLAG, self._at, self._filled)
            if flag < 0:
                self._gather(self._filled)
                return None
            self._gather(flag)
            self._at = flag + 1
            content = self._close()
            if content is not None:
                return content
        return None

    def send(self, message, session, sequence, payload):
        """Write one frame if there is room for all of it now; return whether it was written."""
        if self._room() < len(payload) + wire.HEADER_SIZE + _FCS + 2:
            return False
        header = struct.pack(wire.HEADER_FORMAT, wire.VERSION, message, session, sequence, len(payload))
        content = header + payload
        frame = _FLAG + _stuff(content + struct.pack("<I", binascii.crc32(content))) + _FLAG
        return self._room() >= len(frame) and self._write(frame) == len(frame)

    def _gather(self, end):
        """Move the chunk's octets before `end` to the segment; one that grows too long is only measured."""
        start = self._at
        self._at = end
        length = self._length
        self._length = min(length + end - start, _LONGEST + 1)
        if length + end - start <= _LONGEST:
            self._segment_view[length : length + end - start] = self._chunk_view[start:end]

    def _close(self):
        """The content of the segment that a flag has just ended, or None."""
        length = self._length
        self._length = 0
        if not length:
            return None
        if length > _LONGEST:
            self.discarded += 1
            return None
        segment = bytes(self._segment_view[:length])
        content = _unstuff(segment)
        if content is not None and len(content) >= _SHORTEST and binascii.crc32(content) == _GOOD:
            return content[:-_FCS]
        if not _is_text(segment):
            self.discarded += 1
        return None


def _stuff(content):
    # The escape octet first: the others bring escapes of their own.
    content = content.replace(_ESCAPE, _STUFFED_ESCAPE)
    return content.replace(_FLAG, _STUFFED_FLAG).replace(_INTERRUPT, _STUFFED_INTERRUPT)


def _unstuff(segment):
    """What was stuffed, or None where an escape or a bare 03 cannot come from our map."""
    if _INTERRUPT in segment:
        return None
    escapes = segment.count(_ESCAPE)
    if not escapes:
        return segment
    ours = segment.count(_STUFFED_ESCAPE) + segment.count(_STUFFED_FLAG) + segment.count(_STUFFED_INTERRUPT)
    if ours != escapes:
        return None
    # The escape octet last, in the reverse of the order in which it was stuffed.
    segment = segment.replace(_STUFFED_FLAG, _FLAG).replace(_STUFFED_INTERRUPT, _INTERRUPT)
    return segment.replace(_STUFFED_ESCAPE, _ESCAPE)


def _is_text(segment):
    """Whether this was typed: UTF-8 without control characters other than line ends and tabs."""
    for octet in segment:
        if octet < 0x20 and octet not in b"\t\r\n" or octet == 0x7F:
            return False
    try:
        str(segment, "utf-8")
    except UnicodeError:
        return False
    return True
