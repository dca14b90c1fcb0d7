"""Serves one simulated board to whoever comes, at the pace of the wall clock or faster.

One thread: it listens, lets the board run as far as the pace allows, and hands its bytes out. It must not
know frames; what a client sends is a request to it, whatever it says.
"""

from __future__ import annotations

import time

from sinkwright.simulator.launcher import SimulatedBoard
from sinkwright.simulator.listeners import Listener
from sinkwright.simulator.pace import Pace

#: Wall time between two looks at the clock while nobody sends: short beside a telemetry interval, long
#: beside the work of one (a step or two of the board).
SLICE_S = 0.005
#: One grant at most, so that what is sent meanwhile does not wait for long at a high speed.
MAX_GRANT_US = 100_000
#: Above speed 1 the board waits this long for a client that does not read, then goes on and drops.
READER_PATIENCE_S = 0.25
#: What the board takes in: a microcontroller's receive buffer, emptied by a chunk in each control step.
#: Beyond it a client waits, as on USB.
BUFFER_BYTES = 512
BYTES_PER_MS = 20


class Server:
    """One board, one listener."""

    def __init__(self, board: SimulatedBoard, listener: Listener, speed: float, silence_us: int) -> None:
        self._board = board
        self._listener = listener
        self._pace = Pace(speed, silence_us, time.monotonic(), board.board_time_us)
        self._slice_us = round(min(MAX_GRANT_US, SLICE_S * speed * 1e6))
        self._incoming = b""
        self._room = BUFFER_BYTES

    def run(self) -> None:
        """Serve until an exception ends it: KeyboardInterrupt, or LinkLost when the board has ended."""
        while True:
            self.turn()

    def turn(self) -> None:
        """Listen, then let the board run for one grant if it may."""
        board_us = self._board.board_time_us
        due_us = self._pace.due_us(time.monotonic(), board_us)
        self._listen(self._patience_s(due_us, board_us), board_us)
        if self._waits_for_reader():
            return
        if self._is_worth_it(due_us):
            self._step(min(due_us, MAX_GRANT_US))

    def _is_worth_it(self, due_us: int) -> bool:
        """Whether to run the board now: a slice is due, or a request waits that it can take in."""
        return due_us >= self._slice_us or bool(due_us and self._incoming and self._room)

    def _patience_s(self, due_us: int, board_us: int) -> float | None:
        """How long listening may take: until the next slice is due; None is for ever."""
        if self._waits_for_reader():
            return SLICE_S
        if self._is_worth_it(due_us):
            return 0.0
        if self._pace.waits_for_request(board_us) and not self._incoming:
            return None
        return SLICE_S

    def _listen(self, timeout_s: float | None, board_us: int) -> None:
        if len(self._incoming) >= BUFFER_BYTES:
            time.sleep(min(timeout_s or 0.0, SLICE_S))
            return
        if arrived := self._listener.receive(timeout_s):
            self._incoming += arrived
            self._pace.heard(time.monotonic(), board_us)

    def _waits_for_reader(self) -> bool:
        return self._pace.speed > 1 and 0 < self._listener.stuck_for_s() < READER_PATIENCE_S

    def _step(self, grant_us: int) -> None:
        before_us = self._board.board_time_us
        data, self._incoming = self._incoming[: self._room], self._incoming[self._room :]
        said, now_us = self._board.exchange(data, grant_us)
        emptied = (now_us - before_us) * BYTES_PER_MS // 1000
        self._room = min(BUFFER_BYTES, self._room - len(data) + emptied)
        if said:
            self._listener.send(said)
