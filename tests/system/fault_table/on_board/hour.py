"""One hour of the board's time with the true firmware, and what its memory looks like meanwhile.

Arguments: the simulated board's set-up (JSON), and how many seconds of the board's time to run. Prints JSON: octets
that the simulated world alone holds, what the started firmware adds, and what is held every five minutes, each after a
collection; how often current flowed when time was granted, and how many requests were refused. The host that is
played here beats every tenth of a second, changes the set-point, turns off and on, and reads status and log, as a
real one does; it forgets all it hears, so that what grows is the firmware's.
"""

import builtins
import gc
import json
import struct
import sys

from frames import CaseOver, frame

import board as simulated_board
import wire
from start import print_into

_GRANT_us = 117_500  # fifty control periods
_LOOK_us = 300_000_000
_MINUTE_us = 60_000_000
_SETTLED_us = 600_000
_SESSION = 7


class Host:
    """In place of the pipe. Every grant brings one request."""

    out_count = 0

    def __init__(self, end_us):
        self.end_us = end_us
        self.plant = None
        self.held = []
        self.at_rest = 0
        self.refused = 0
        self.sinking = 0
        self._sequence = 0
        self._looked_us = 0
        self._minute = 0
        self._due_us = 0
        self._queue = [("HELLO", 1, 0), ("SET_TELEMETRY", 43)]

    def put(self, data):
        if data[2] == wire.REFUSED:
            self.refused += 1
        self.out_count += len(data)

    def answer(self, now_us):
        self.out_count = 0

    def grant(self):
        now = self.plant.now
        if now >= self.end_us:
            raise CaseOver(0)
        if not self.at_rest and now > _SETTLED_us:
            gc.collect()
            self.at_rest = gc.mem_alloc()
        if now - self._looked_us >= _LOOK_us:
            self._looked_us = now
            gc.collect()
            self.held.append(gc.mem_alloc())
        if now // _MINUTE_us > self._minute:
            self._minute = now // _MINUTE_us
            self._queue = self._round()
        if self.plant.current_A > 0.1:
            self.sinking += 1
        # The board hands over the time whenever it has said something; a request goes out only when it is due.
        if now < self._due_us:
            return self._due_us - now, b""
        self._due_us = now + _GRANT_us
        return _GRANT_us, self._say(*self._queue.pop(0)) if self._queue else self._say("BEAT")

    def _round(self):
        """What is asked once a minute."""
        asked = [("GET_STATUS",), ("GET_LIMITS", 0), ("GET_FAULT",), ("GET_RUN",)]
        asked += [("GET_LOG", first) for first in range(0, 12, 4)]
        asked.append(("SET_POINT", 1, 500_000 + self._minute % 5 * 400_000))
        if self._minute % 10 == 9:
            asked.append(("DISABLE",))
        if self._minute % 10 == 1:
            asked.append(("ENABLE", 0, 0, 0))
        return asked

    def _say(self, name, *values):
        self._sequence += 1
        payload = struct.pack(getattr(wire, name + "_FORMAT"), *values)
        identity = getattr(wire, name)
        head = struct.pack(
            wire.HEADER_FORMAT, wire.VERSION, identity, _SESSION, self._sequence & 0xFFFF, len(payload)
        )
        return frame(head + payload)


def main():
    seconds = int(sys.argv[4])
    with open(sys.argv[3]) as file:
        setup = json.load(file)
    host = Host(seconds * 1_000_000)
    made = simulated_board.install(setup, host)
    host.plant = made.plant
    del setup
    told = builtins.print
    builtins.print = print_into(made.stream)
    gc.collect()
    world = gc.mem_alloc()
    # Only now: its code counts as the firmware's.
    import main as firmware

    try:
        firmware.run(simulated_board.open_board())
    except CaseOver:
        builtins.print = told
    told(
        json.dumps(
            {
                "world": world,
                "firmware": host.at_rest - world,
                "held": host.held,
                "sinking": host.sinking,
                "refused": host.refused,
            }
        )
    )
