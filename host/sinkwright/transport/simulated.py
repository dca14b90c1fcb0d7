"""A simulated board as a channel: lock-step at `speed=max`, else paced against the wall clock.

Decides how fast simulated time goes; what happens in it is the simulator's. Paced, one reader thread owns the
board: it grants the time that the wall clock has passed, times the speed, and hands over what was sent.
"""

from __future__ import annotations

import math
import threading
import time
from typing import Protocol

from sinkwright.errors import LinkLost
from sinkwright.simulator.pace import Pace
from sinkwright.transport.channel import Channel
from sinkwright.transport.reader_thread import ThreadedChannel
from sinkwright.transport.urls import SimulatedUrl

#: Wall time between two grants. Short beside a telemetry interval, long beside an exchange (about 15 us).
PACE_S = 0.005

#: One grant at most, so that what is sent meanwhile does not wait for long at a high speed.
MAX_GRANT_US = 50_000


class Exchanges(Protocol):
    """What pacing needs of a simulated board."""

    @property
    def board_time_us(self) -> int: ...

    def exchange(self, data: bytes, grant_us: int) -> tuple[bytes, int]: ...

    def close(self) -> None: ...


class PacedPort:
    """A simulated board that runs at `speed` times the wall clock, at the pace of `simulator.pace`."""

    failures = (LinkLost, OSError)
    simulated = True

    def __init__(self, board: Exchanges, speed: float, silence_s: float) -> None:
        self.speed = speed
        self._board = board
        self._outgoing = bytearray()
        self._arrived = threading.Condition()
        self._board_us = board.board_time_us
        self._pace = Pace(speed, round(silence_s * 1e6), time.monotonic(), self._board_us)

    def read(self) -> bytes:
        due_us = self._due_us()
        with self._arrived:
            if not self._outgoing and due_us < PACE_S * 1e6 * self.speed:
                self._arrived.wait(PACE_S)
                due_us = self._due_us()
            data = bytes(self._outgoing)
            self._outgoing.clear()
            if data:
                self._pace.heard(time.monotonic(), self._board_us)
        if not data and due_us <= 0:
            return b""
        answer, self._board_us = self._board.exchange(data, max(1, min(due_us, MAX_GRANT_US)))
        return answer

    def write(self, data: bytes) -> None:
        with self._arrived:
            self._outgoing += data
            self._arrived.notify()

    def now_s(self) -> float:
        return self._board_us / 1e6

    def close(self) -> None:
        self._board.close()

    def _due_us(self) -> int:
        return self._pace.due_us(time.monotonic(), self._board_us)


def open_simulated(url: SimulatedUrl) -> Channel:
    """Start the simulated board that `url` describes. Raises FileError for its files, LinkLost if it ends."""
    from sinkwright.definitions.loading import load_board, load_source
    from sinkwright.demo import demo_source_path
    from sinkwright.simulator.launcher import SimulatedBoard
    from sinkwright.transport.lockstep import LockStepChannel

    source = load_source(url.source or demo_source_path())
    board = load_board(url.board)
    simulated = SimulatedBoard.start(source, board, url.seed, url.store)
    if url.speed == math.inf:
        return LockStepChannel(url.text, simulated)
    return ThreadedChannel(url.text, PacedPort(simulated, url.speed, board.limits.host_silence_s))
