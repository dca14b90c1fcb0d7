"""A simulated board whose time advances only while its host waits for it.

Decides how much time a wait grants. Nothing suspends here: `receive` runs the board inline, so equal
requests meet the board at equal times however loaded the machine is, and equal seeds give equal bytes. It
must not know frames.
"""

from __future__ import annotations

import math
from typing import Protocol

from sinkwright.transport.channel import Channel

#: The longest grant: a run's telemetry interval of 0.1 s with the control step in which it ends, so that a frame costs
#: one exchange, and whoever waits sees the board's clock and a stop in time.
GRANT_S = 0.11


class Exchanges(Protocol):
    """What lock-step needs of a simulated board."""

    @property
    def board_time_us(self) -> int: ...

    def exchange(self, data: bytes, grant_us: int) -> tuple[bytes, int]: ...

    def close(self) -> None: ...


class LockStepChannel(Channel):
    """The channel of `sim:...,speed=max`. Its clock is the board's."""

    simulated = True
    lock_step = True

    def __init__(self, url: str, board: Exchanges, grant_s: float = GRANT_S) -> None:
        self.url = url
        self._board = board
        self._grant_us = round(grant_s * 1e6)
        self._time_us = board.board_time_us
        self._outgoing = b""
        self._woken = False

    async def receive(self, timeout_s: float) -> bytes:
        exchange = self._board.exchange
        time_us = self._time_us
        # Rounded up: a wait shorter than a microsecond must let time pass, or it would never be over.
        end_us = time_us + math.ceil(timeout_s * 1e6)
        outgoing, self._outgoing = self._outgoing, b""
        while True:
            data, time_us = exchange(outgoing, max(0, min(self._grant_us, end_us - time_us)))
            self._time_us = time_us
            if data or time_us >= end_us or self._woken:
                self._woken = False
                return data
            outgoing = b""

    def send(self, data: bytes) -> None:
        self._outgoing += data

    def now_s(self) -> float:
        return self._time_us / 1e6

    def close(self) -> None:
        self._board.close()

    def wake(self) -> None:
        self._woken = True
