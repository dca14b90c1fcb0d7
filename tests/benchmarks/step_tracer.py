"""Runs the true firmware on the simulated board under CPython and counts what one turn of the loop does.

Run as a program: the paths and the case come as JSON on the standard input, the counts go to the standard output.
A line of the firmware that runs counts with the number of MicroPython's operations that the input gives for it.
The simulated world is not counted; the bus transactions are, by their bits on the wire.
"""

import builtins
import json
import sys

CASE = json.load(sys.stdin)
sys.path[:0] = CASE["paths"]

import cpython_stand_ins  # noqa: E402

cpython_stand_ins.install()

import bench  # noqa: E402

import start  # noqa: E402

_FIRMWARE = CASE["firmware"]


class Counter:
    """Per control period: operations and calls within the step and outside it, transactions and bits."""

    def __init__(self):
        self.periods = []
        self._now = [0, 0, 0, 0, 0, 0]
        self._in_step = None

    def next_period(self):
        self.periods.append(self._now)
        self._now = [0, 0, 0, 0, 0, 0]

    def trace(self, frame, event, _argument):
        path = frame.f_code.co_filename
        if not path.startswith(_FIRMWARE):
            return None
        if self._in_step is None and path.endswith("/control.py") and frame.f_code.co_name == "step":
            self._in_step = frame
        self._now[2 if self._in_step else 3] += 1
        operations = CASE["operations"].get(path[len(_FIRMWARE) :].lstrip("/"), {})

        def line(frame, event, _argument):
            if event == "line":
                self._now[0 if self._in_step else 1] += operations.get(str(frame.f_lineno), 0)
            elif event == "return" and frame is self._in_step:
                self._in_step = None
            return line

        return line

    def on_bus(self, bits):
        self._now[4] += 1
        self._now[5] += bits


class CountingBus:
    """Start, stop and nine bits an octet; a register is an octet more, reading it back a repeated start."""

    def __init__(self, bus, counter):
        self._bus = bus
        self._counter = counter

    def writeto(self, address, buffer):
        self._counter.on_bus(2 + 9 * (1 + len(buffer)))
        self._bus.writeto(address, buffer)

    def writeto_mem(self, address, register, buffer):
        self._counter.on_bus(2 + 9 * (2 + len(buffer)))
        self._bus.writeto_mem(address, register, buffer)

    def readfrom_into(self, address, buffer):
        self._counter.on_bus(2 + 9 * (1 + len(buffer)))
        self._bus.readfrom_into(address, buffer)

    def readfrom_mem_into(self, address, register, buffer):
        self._counter.on_bus(3 + 9 * (3 + len(buffer)))
        self._bus.readfrom_mem_into(address, register, buffer)


class TracedBench(bench.Bench):
    def __init__(self, case):
        self.counter = Counter()
        bench.Bench.__init__(self, case)
        self.board.bus = CountingBus(self.board.bus, self.counter)

    def grant(self):
        if self.plant.now >= self.case["onset_us"]:
            if sys.gettrace() is None:
                sys.settrace(self.counter.trace)
            self.counter.next_period()
        return bench.Bench.grant(self)


def main():
    traced = TracedBench(CASE["case"])
    told = print
    builtins.print = start.print_into(traced.board.stream)
    left = traced._start()
    sys.settrace(None)
    builtins.print = told
    print(json.dumps({"left": left, "refused": traced.refused, "periods": traced.counter.periods[2:]}))


if __name__ == "__main__":
    main()
