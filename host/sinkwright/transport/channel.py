"""What carries bytes to a board and back: the one seam under which serial ports, sockets and simulators lie.

A channel moves bytes and tells the time that time-outs are counted by. It must not know frames, messages or
what a load is. Everything above it is `async`, and on a lock-step channel nothing ever suspends, so the same
code runs with an event loop and without one.
"""

from __future__ import annotations

from abc import ABC, abstractmethod

#: Boards count whole microseconds: a deadline closer than that is reached, whatever a float has left of it.
TICK_S = 1e-6


class Channel(ABC):
    """A two-way byte stream to one board.

    `url` names it in errors. `simulated` says whether a simulated board answers. `lock_step` says that
    `receive` never suspends: the board's time advances only inside that call.
    """

    url: str
    simulated: bool = False
    lock_step: bool = False

    @abstractmethod
    async def receive(self, timeout_s: float) -> bytes:
        """Bytes as they came; `b""` when nothing came within `timeout_s` (counted by `now_s`), or after
        `wake`.

        Raises LinkLost when the way to the board is gone, and again at every later call.
        """

    @abstractmethod
    def send(self, data: bytes) -> None:
        """Hand over all of `data`. Raises LinkLost when the way to the board is gone or does not take it."""

    @abstractmethod
    def now_s(self) -> float:
        """A clock that never goes back: the machine's, or the simulated board's where that one counts."""

    def reached(self, deadline_s: float) -> bool:
        """Whether `deadline_s` has come on this channel's clock, to a microsecond."""
        return self.now_s() >= deadline_s - TICK_S

    @abstractmethod
    def close(self) -> None:
        """Let go of the device. May be called twice; never raises."""

    def wake(self) -> None:  # noqa: B027  a lock-step channel has nobody to wake
        """Let a waiting `receive` return at once. Safe from a signal handler and from any thread."""
