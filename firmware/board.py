"""The one file that touches the microcontroller: clock, bus, pins and stream, as MicroPython's RP2 port has them.

Everything else is handed these objects and runs unchanged in the simulator, which replaces this file alone. Short
enough to check by eye against the port's documentation; what differs between two boards of the same kind stands
in board.json, which the host makes out of the board file.
"""

import errno
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
_STORE_FILE = "store."
_RESTART_FILE = "restart.txt"
# Longer than any wait in the loop, and than the erasing of a few flash blocks while the load is off.
_WATCHDOG_ms = const(2_000)
_LAST_WORDS_us = const(100_000)


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


class NotFitted:
    """Takes the calls of a pin or a bus that the board file does not name. Nothing is driven; a bus is silent."""

    def value(self, level=1):
        return 1

    def writeto(self, *_arguments):
        raise OSError(errno.ENODEV)

    writeto_mem = readfrom_into = readfrom_mem_into = writeto


def _output(number):
    """An output that starts low: the level is set before the pin becomes an output."""
    return NotFitted() if number is None else machine.Pin(number, machine.Pin.OUT, value=0)


def _input(number):
    """An input against ground, pulled high."""
    return NotFitted() if number is None else machine.Pin(number, machine.Pin.IN, machine.Pin.PULL_UP)


def _bus(entry):
    if not entry:
        return NotFitted()
    return machine.I2C(
        entry["id"],
        scl=machine.Pin(entry["scl"]),
        sda=machine.Pin(entry["sda"]),
        freq=entry["frequency_Hz"],
        timeout=_BUS_TIMEOUT_us,
    )


class Gate:
    """Low or high-impedance clamps; high releases."""

    def __init__(self, number):
        self._pin = _output(number)

    def clamp(self):
        self._pin.value(0)

    def release(self):
        self._pin.value(1)


class Trigger:
    """The trigger output, low at rest; a board without one (`number` None) takes the same calls."""

    def __init__(self, number):
        self._pin = _output(number)

    def set(self, level):
        self._pin.value(1 if level else 0)


class Pins:
    """What a board without converter chips uses of the microcontroller's own."""

    def pwm(self, number, frequency_Hz):
        return machine.PWM(machine.Pin(number), freq=frequency_Hz, duty_u16=0)

    def analogue(self, number):
        return machine.ADC(machine.Pin(number))

    def digital(self, number):
        return _input(number)


class Led:
    """Red: sinking or fault. Green: ready or ended. Both: fault. Dark while the blinking (lamp.py) says so."""

    def __init__(self, red, green):
        self._red = _output(red)
        self._green = _output(green)

    def show(self, state, lit=True):
        # Called within the control step, where `in (...)` would make a tuple.
        self._red.value(lit and (state == wire.STATE_SINKING or state == wire.STATE_FAULT))
        self._green.value(lit and state != wire.STATE_SINKING)


class Store:
    """The slots of store.py as files. A cut write leaves that file short or gone, and the other one as it was."""

    def read(self, slot):
        try:
            with open(_STORE_FILE + str(slot), "rb") as file:
                return file.read()
        except OSError:
            return b""

    def write(self, slot, data):
        with open(_STORE_FILE + str(slot), "wb") as file:
            file.write(data)


class Watchdog:
    """The RP2's: once started it cannot be stopped, and waits 8.388 s at most."""

    def __init__(self):
        self._timer = None

    def start(self):
        self._timer = machine.WDT(timeout=_WATCHDOG_ms)

    def feed(self):
        if self._timer is not None:
            self._timer.feed()


class Board:
    simulated = False

    def __init__(self, image):
        pins = image.get("pins", {})
        self.gate = Gate(pins.get("gate"))
        self.image = image
        self.led = Led(pins.get("led_red"), pins.get("led_green"))
        self.trigger = Trigger(pins.get("trigger"))
        self.stream = Stream()
        self.clock = Clock(self.stream)
        self.bus = _bus(image.get("i2c"))
        self.pins = Pins()
        self.store = Store()
        self.watchdog = Watchdog()
        self._fan = _output(pins.get("fan"))
        self._button = _input(pins.get("off_button"))
        self.board_id = machine.unique_id()
        #: The store counts boots; this stands where it cannot.
        self.boot_number = int.from_bytes(os.urandom(4), "little")
        self.reset_cause, self.maintenance = _why_started()
        self.interpreter = "MicroPython " + ".".join(str(part) for part in sys.implementation.version[:3])

    def button(self):
        """Whether OFF is pressed: the button pulls its pin to ground."""
        return not self._button.value()

    def fan(self, on):
        self._fan.value(on)

    def restart(self, maintenance, cause):
        """Reset the microcontroller, which lets go of the gate; the next start is told why, by a file."""
        try:
            with open(_RESTART_FILE, "w") as file:
                file.write(str(cause) + (" maintenance" if maintenance else ""))
        except OSError:
            pass  # The next start will take this for the watchdog's.
        # What was written last leaves first.
        self.clock.wait_until(self.clock.add(self.clock.ticks_us(), _LAST_WORDS_us))
        machine.reset()


def _why_started():
    """(reset cause, whether for maintenance). The port calls every reset of its own a watchdog's: hence the file."""
    try:
        with open(_RESTART_FILE) as file:
            words = file.read().split()
        os.remove(_RESTART_FILE)
        return int(words[0]), len(words) > 1
    except (OSError, ValueError, IndexError):
        watchdog = machine.reset_cause() == machine.WDT_RESET
        return (wire.RESET_WATCHDOG if watchdog else wire.RESET_POWER_ON), False


def open_board():
    """The board that the image describes; without a good one, a board that has nothing but its serial port.

    Its pins are then left alone, so that the passive pull clamps the gate; the firmware's self-test says the rest.
    """
    try:
        with open(_IMAGE_FILE) as file:
            return Board(json.load(file))
    except (OSError, ValueError, KeyError, TypeError, AttributeError) as error:
        print("no board can be made of " + _IMAGE_FILE + ":", repr(error))
        return Board({})
