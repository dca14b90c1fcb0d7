"""The pipe to the host: whoever is there grants time and bytes, and gets time and bytes back.

Host to board "<IH" grant_us, n and n bytes; board to host "<QH" board_time_us, n and n bytes
(little-endian). A closed pipe ends the simulated board by SystemExit(0), which no `except Exception` of the
firmware holds up.
"""

import struct
import sys

_OUT_HEAD = "<QH"
_OUT_HEAD_BYTES = 10
_IN_HEAD = "<IH"
_IN_HEAD_BYTES = 6
_IN_BYTES = 65535


class Pipe:
    """`out` holds what the board has written, after the room for the head; `incoming` what the host sent."""

    def __init__(self, room, reader=None, writer=None):
        self._reader = reader or sys.stdin.buffer
        self._writer = writer or sys.stdout.buffer
        self.out = memoryview(bytearray(_OUT_HEAD_BYTES + room))
        self.out_count = 0
        self._head = bytearray(_IN_HEAD_BYTES)
        self._pending = b""

    def put(self, data):
        """Take `data` for the next answer."""
        start = _OUT_HEAD_BYTES + self.out_count
        self.out[start : start + len(data)] = data
        self.out_count += len(data)

    def answer(self, now_us):
        struct.pack_into(_OUT_HEAD, self.out, 0, now_us, self.out_count)
        self._writer.write(self.out[: _OUT_HEAD_BYTES + self.out_count])
        self._writer.flush()
        self.out_count = 0

    def grant(self):
        """Wait for the host's next grant; return (microseconds, bytes)."""
        if self._reader.readinto(self._head) != _IN_HEAD_BYTES:
            raise SystemExit(0)
        grant_us, count = struct.unpack(_IN_HEAD, self._head)
        return grant_us, self._read(count) if count else b""

    def _read(self, count):
        data = b""
        while len(data) < count:
            more = self._reader.read(count - len(data))
            if not more:
                raise SystemExit(0)
            data += more
        return data
