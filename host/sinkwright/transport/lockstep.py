"""A simulated board whose time advances only while its host waits for it, or works on what it said.

Decides how much time a wait grants. Nothing suspends here: `receive` runs the board inline, so equal
requests meet the board at equal times however loaded the machine is, and equal seeds give equal bytes. While
frames only stream in, the board runs one grant ahead, on another processor, during the host's own work; what the
host then sends arrives one grant later, as on a cable with frames on their way. It must not know frames.
"""

from __future__ import annotations

import contextlib
import math
from typing import Protocol

from sinkwright.errors import LinkLost
from sinkwright.transport.channel import Channel

#: The longest grant: a run's telemetry interval of 0.1 s with the control step in which it ends, so that a frame costs
#: one exchange, and whoever waits sees the board's clock and a stop in time.
GRANT_S = 0.11


#: So many receives in a row with something to tell, and nothing sent, mean that frames only stream in.
CALM_RECEIVES = 2


class Exchanges(Protocol):
    """What lock-step needs of a simulated board."""

    @property
    def board_time_us(self) -> int: ...

    def exchange(self, data: bytes, grant_us: int) -> tuple[bytes, int]: ...

    def run_ahead(self, grant_us: int) -> None: ...

    def catch_up(self) -> tuple[bytes, int]: ...

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
        self._ahead = False
        self._calm = 0

    async def receive(self, timeout_s: float) -> bytes:
        # Rounded up: a wait shorter than a microsecond must let time pass, or it would never be over.
        end_us = self._time_us + math.ceil(timeout_s * 1e6)
        while True:
            data, self._time_us = self._next(end_us - self._time_us)
            if data or self._time_us >= end_us or self._woken:
                self._woken = False
                self._look_ahead(bool(data))
                return data

    def _next(self, left_us: int) -> tuple[bytes, int]:
        if self._ahead:
            self._ahead = False
            return self._board.catch_up()
        outgoing, self._outgoing = self._outgoing, b""
        return self._board.exchange(outgoing, max(0, min(self._grant_us, left_us)))

    def _look_ahead(self, spoke: bool) -> None:
        """Whether the board may run on: only by what was received and sent, never by how long anything took."""
        self._calm = self._calm + 1 if spoke and not self._outgoing else 0
        if self._calm >= CALM_RECEIVES:
            # A board that has ended is told by the next receive; what was received now must not be lost over it.
            with contextlib.suppress(LinkLost):
                self._board.run_ahead(self._grant_us)
                self._ahead = True

    def send(self, data: bytes) -> None:
        self._outgoing += data
        self._calm = 0

    def now_s(self) -> float:
        return self._time_us / 1e6

    def close(self) -> None:
        self._board.close()

    def wake(self) -> None:
        self._woken = True
