"""Ways to a FakeBoard: lock-step for tests of rules, in real time for tests of threads and event loops."""

from __future__ import annotations

import threading
import time
from collections.abc import Callable

from sinkwright.transport.channel import Channel
from tests.support.fake_board import FakeBoard


class LockStepFake(Channel):
    """A FakeBoard, or any function from bytes to bytes, whose time advances only inside `receive`."""

    lock_step = True

    def __init__(self, board: FakeBoard | Callable[[bytes], bytes], url: str = "fake:") -> None:
        self.url = url
        self.closed = False
        self.pending = b""
        self.sent: list[bytes] = []
        self._board = board
        self._time_us = 0

    async def receive(self, timeout_s: float) -> bytes:
        data, self.pending = self.pending, b""
        if not data and isinstance(self._board, FakeBoard):
            data = self._board.advance(round(timeout_s * 1e6))
            self._time_us = self._board.time_us
        elif not data:
            self._time_us += round(timeout_s * 1e6)
        return data

    def send(self, data: bytes) -> None:
        self.sent.append(data)
        self.pending += self._board.hear(data) if isinstance(self._board, FakeBoard) else self._board(data)

    def now_s(self) -> float:
        return self._time_us / 1e6

    def close(self) -> None:
        self.closed = True


class PacedFake:
    """A FakeBoard in real time, as a port for the reader thread. `gone` breaks the connection."""

    failures = (OSError,)
    simulated = False
    speed = 1.0

    def __init__(self, board: FakeBoard) -> None:
        self.board = board
        self.gone = False
        self.closed = False
        self._lock = threading.Lock()
        self._pending = b""
        self._then_s = time.monotonic()

    def read(self) -> bytes:
        time.sleep(0.002)
        if self.gone:
            raise OSError("device reports readiness to read but returned no data")
        with self._lock:
            now_s = time.monotonic()
            self._pending += self.board.advance(round((now_s - self._then_s) * 1e6))
            self._then_s = now_s
            data, self._pending = self._pending, b""
        return data

    def write(self, data: bytes) -> None:
        if self.gone:
            raise OSError("write failed")
        with self._lock:
            self._pending += self.board.hear(data)

    def now_s(self) -> float:
        return time.monotonic()

    def close(self) -> None:
        self.closed = True
