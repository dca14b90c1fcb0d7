"""How far simulated time may have gone by a given moment of the wall clock.

Above speed 1 it never passes the last request plus half the silence limit: a host that is a little slow would
otherwise be taken for dead. Pure arithmetic; whoever asks owns the clocks and the board.
"""

from __future__ import annotations

import math

#: A backlog beyond this wall time (a laptop that slept, a machine too slow for the speed) is forgiven
#: instead of being run through at full speed.
MAX_BACKLOG_S = 1.0


class Pace:
    """The pace of one board at `speed` times the wall clock (inf: as fast as it can)."""

    def __init__(self, speed: float, silence_us: int, now_s: float, board_us: int = 0) -> None:
        self.speed = speed
        self._lead_us = silence_us // 2 if speed > 1 else None
        self._last_request_us = board_us
        self._anchor_s = now_s
        self._anchor_us = board_us

    def heard(self, now_s: float, board_us: int) -> None:
        """A request came now, with the board's clock here."""
        if self.waits_for_request(board_us):
            # What the board stood still is not made up for.
            self._anchor_s, self._anchor_us = now_s, board_us
        self._last_request_us = board_us

    def due_us(self, now_s: float, board_us: int) -> int:
        """What the board may run from `board_us` on; 0 when it must wait."""
        due_us = self._flowed_us(now_s, board_us)
        if self._lead_us is not None:
            due_us = min(due_us, self._last_request_us + self._lead_us - board_us)
        return max(0, int(due_us))

    def waits_for_request(self, board_us: int) -> bool:
        """Whether only a request, and no lapse of time, lets the board go on."""
        return self._lead_us is not None and board_us >= self._last_request_us + self._lead_us

    def _flowed_us(self, now_s: float, board_us: int) -> float:
        if math.isinf(self.speed):
            return math.inf
        due_us = self._anchor_us + (now_s - self._anchor_s) * self.speed * 1e6 - board_us
        most_us = MAX_BACKLOG_S * self.speed * 1e6
        if due_us > most_us:
            self._anchor_s, self._anchor_us = now_s - MAX_BACKLOG_S, board_us
            return most_us
        return due_us
