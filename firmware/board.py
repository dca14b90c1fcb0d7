"""The one file that touches the microcontroller: clock, bus, pins and stream, as MicroPython's RP2 port has them.

Everything else is handed these objects and runs unchanged in the simulator, which replaces this file alone. Short
enough to check by eye against the port's documentation; what differs between two boards of the same kind stands
in board.json, which the host makes out of the board file.
"""

import json
import os
import select
import sys
import time

import machine
from micropython import const

import wire

_IMAGE_FILE = "board.json"
_BUS_TIMEOUT_us = const(2_000)
_OUT_BYTES = const(512)


class Clock:
    """Microsecond ticks, which wrap at 2**30 on this port: only differences mean anything."""

    def __init__(self, stream):
        self._stream = stream
        self.ticks_us = time.ticks_us
        self.add = time.ticks_add

    def since(self, earlier):
        return time.ticks_diff(time.ticks_us(), earlier)

    def wait_until(self, ticks):
        """The idle time of a period is when bytes leave."""
        while time.ticks_diff(ticks, time.ticks_us()) > 0:
            self._stream.pump()


class Stream:
    """The USB serial port, never waited for.

    While a port is open and unread, a write into a full buffer blocks for up to 500 ms on this port, and POLLOUT
    promises a single byte. So what is written goes into a buffer here, and `pump` moves it a byte at a time.
    """

    def __init__(self):
        self._poll = select.poll()
        self._poll.register(sys.stdin, select.POLLIN)
        self._poll_out = select.poll()
        self._poll_out.register(sys.stdout, select.POLLOUT)
        self._byte = bytearray(1)
        self._out = bytearray(_OUT_BYTES)
        self._first = 0
        self._waiting = 0

    def read_into(self, buffer):
        """Bytes that are there, into `buffer`; return how many. One at a time: a longer read would block."""
        count = 0
        while count < len(buffer) and _ready(self._poll):
            sys.stdin.buffer.readinto(self._byte)
            buffer[count] = self._byte[0]
            count += 1
        return count

    def room(self):
        return _OUT_BYTES - self._waiting

    def write(self, data):
        """Take `data` for sending; the caller has asked for the room."""
        for byte in data:
            self._out[(self._first + self._waiting) % _OUT_BYTES] = byte
            self._waiting += 1
        return len(data)

    def pump(self):
        if self._waiting and _ready(self._poll_out):
            self._byte[0] = self._out[self._first]
            sys.stdout.buffer.write(self._byte)
            self._first = (self._first + 1) % _OUT_BYTES
            self._waiting -= 1


def _ready(poll):
    """Whether the one stream of `poll` is ready; `ipoll` makes no list, and this is asked all the idle time."""
    for _ in poll.ipoll(0):
        return True
    return False


class Gate:
    """Low or high-impedance clamps; high releases. Low before the pin becomes an output."""

    def __init__(self, number):
        self._pin = machine.Pin(number, machine.Pin.OUT, value=0)

    def clamp(self):
        self._pin.value(0)

    def release(self):
        self._pin.value(1)


class Led:
    """Red: sinking or fault. Green: ready or ended. Both: fault."""

    def __init__(self, red, green):
        self._red = machine.Pin(red, machine.Pin.OUT, value=0)
        self._green = machine.Pin(green, machine.Pin.OUT, value=0)

    def show(self, state):
        # Called within the control step, where `in (...)` would make a tuple.
        self._red.value(state == wire.STATE_SINKING or state == wire.STATE_FAULT)
        self._green.value(state != wire.STATE_SINKING)


class Board:
    simulated = False

    def __init__(self, image):
        pins = image["pins"]
        i2c = image["i2c"]
        self.gate = Gate(pins["gate"])
        self.image = image
        self.led = Led(pins["led_red"], pins["led_green"])
        self.stream = Stream()
        self.clock = Clock(self.stream)
        self.bus = machine.I2C(
            i2c["id"],
            scl=machine.Pin(i2c["scl"]),
            sda=machine.Pin(i2c["sda"]),
            freq=i2c["frequency_Hz"],
            timeout=_BUS_TIMEOUT_us,
        )
        self.board_id = machine.unique_id()
        self.boot_number = int.from_bytes(os.urandom(4), "little")
        self.reset_cause = (
            wire.RESET_WATCHDOG if machine.reset_cause() == machine.WDT_RESET else wire.RESET_POWER_ON
        )
        self.interpreter = "MicroPython " + ".".join(str(part) for part in sys.implementation.version[:3])


def open_board():
    with open(_IMAGE_FILE) as file:
        return Board(json.load(file))
