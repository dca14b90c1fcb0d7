"""The simulated board: the one firmware file that is replaced. Same seam, a simulated world.

Time advances only in `clock.wait_until` and by the duration of bus transactions, and only as far as the host
has granted. Everything is handed over by the first line on the standard input (see start.py); nothing here
looks at a wall clock, so the same seed gives the same bytes.
"""

import gc
import sys

import chip_ads1115
import chip_mcp4725
from noise import Noise
from pipe import Pipe
from plant import Plant

# errno of a transaction that nobody acknowledges: EIO, as the RP2 port raises it.
_EIO = 5
# The USB device's buffer of the real board.
_ROOM_BYTES = 256
_LONGEST_TRANSFER = 64
# The RP2's watchdog bites at the latest after 2**23 us.
_WATCHDOG_us = 8_388_607


class Clock:
    """Microseconds since power-up. They never wrap here; the firmware must not care."""

    def __init__(self, plant, host):
        self._plant = plant
        self._host = host

    def ticks_us(self):
        return self._plant.now

    def since(self, earlier):
        return self._plant.now - earlier

    def add(self, ticks, us):
        return ticks + us

    def wait_until(self, ticks):
        """Idle until `ticks`; what was written leaves first, at the time it was written."""
        host = self._host
        if host.pipe.out_count:
            host.exchange()
        plant = self._plant
        while ticks > host.granted_until:
            plant.now = max(plant.now, host.granted_until)
            if plant.now >= plant.due:
                plant.catch_up()
            host.exchange()
        if ticks > plant.now:
            plant.now = ticks
            if ticks >= plant.due:
                plant.catch_up()


class Bus:
    """I2C with machine.I2C's signatures; each transaction takes its time on the wire."""

    def __init__(self, plant, frequency_Hz):
        self._plant = plant
        self.chips = {}
        # Start, stop and nine bits a byte; a register's number is a byte more, reading it back a repeated
        # start.
        bits = range(_LONGEST_TRANSFER + 1)
        self._write_us = [(2 + 9 * (1 + n)) * 1_000_000 // frequency_Hz for n in bits]
        self._read_us = [(3 + 9 * (3 + n)) * 1_000_000 // frequency_Hz for n in bits]

    def readfrom_mem_into(self, address, register, buffer):
        plant = self._plant
        plant.now = now = plant.now + self._read_us[len(buffer)]
        if now >= plant.due:
            plant.catch_up()
        chip = self.chips.get(address)
        if chip is None:
            raise OSError(_EIO)
        chip.read_register(register, buffer)

    def writeto_mem(self, address, register, buffer):
        plant = self._plant
        plant.now = now = plant.now + self._write_us[len(buffer) + 1]
        if now >= plant.due:
            plant.catch_up()
        chip = self.chips.get(address)
        if chip is None:
            raise OSError(_EIO)
        chip.write_register(register, buffer)

    def writeto(self, address, buffer):
        plant = self._plant
        plant.now = now = plant.now + self._write_us[len(buffer)]
        if now >= plant.due:
            plant.catch_up()
        if address == 0:
            for chip in self.chips.values():
                chip.general_call(buffer[0])
            return
        chip = self.chips.get(address)
        if chip is None:
            raise OSError(_EIO)
        chip.write(buffer)


class Gate:
    """Clamped at power-up, as the passive pull does it."""

    def __init__(self, plant):
        self._plant = plant

    def clamp(self):
        self._plant.set_gate(True)

    def release(self):
        self._plant.set_gate(False)


class Led:
    def __init__(self):
        self.shown = -1

    def show(self, state):
        self.shown = state


class Stream:
    """The serial port as the firmware sees it."""

    def __init__(self, host):
        self._host = host
        self._pipe = host.pipe

    def read_into(self, buffer):
        host = self._host
        incoming = host.incoming
        if not incoming:
            return 0
        count = min(len(incoming), len(buffer))
        buffer[:count] = incoming[:count]
        host.incoming = incoming[count:]
        return count

    def room(self):
        return _ROOM_BYTES - self._pipe.out_count

    def write(self, data):
        """Take as much of `data` as there is room for; return how much."""
        count = min(len(data), self.room())
        self._pipe.put(data if count == len(data) else memoryview(data)[:count])
        return count


class Host:
    """What the host has granted and sent, and what it gets."""

    def __init__(self, plant, pipe):
        self._plant = plant
        self.pipe = pipe
        self.incoming = b""
        self.granted_until = 0
        self.fed_at = -1  # a watchdog runs from its first feeding on
        self._first = True

    def exchange(self):
        plant = self._plant
        if self._first:
            # Before the first grant nothing has run, so there is nothing to answer.
            self._first = False
        else:
            if 0 <= self.fed_at < plant.now - _WATCHDOG_us:
                raise SystemExit(4)
            # The firmware's threshold for collecting is meant for what it allocates itself; the world's
            # floats would reach it every few steps.
            gc.threshold(-1)
            self.pipe.answer(plant.now)
        grant_us, data = self.pipe.grant()
        self.granted_until = plant.now + grant_us
        if data:
            self.incoming = self.incoming + data if self.incoming else data


class Board:
    simulated = True

    def __init__(self, setup, pipe):
        entry = setup["plant"]
        image = setup["image"]
        self.image = image
        self.board_id = bytes.fromhex(setup["board_id"])
        self.reset_cause = setup.get("reset_cause") or 1
        self.boot_number = setup["boot_number"]
        self.interpreter = setup.get("interpreter") or _interpreter()
        self.plant = plant = Plant(entry, setup["source"])
        self._host = Host(plant, pipe)
        self.clock = Clock(plant, self._host)
        self.bus = Bus(plant, image["i2c"]["frequency_Hz"])
        self.gate = Gate(plant)
        self.led = Led()
        self.stream = Stream(self._host)
        noise = Noise(setup["seed"], entry["adc"]["noise_counts"] * 65536.0)
        self.adc = chip_ads1115.Chip(entry["adc"], plant, noise)
        self.dac = chip_mcp4725.Chip(entry["dac"], plant)
        self._addresses = {"adc_silent": entry["adc"]["address"], "dac_silent": entry["dac"]["address"]}
        self.bus.chips[entry["adc"]["address"]] = self.adc
        self.bus.chips[entry["dac"]["address"]] = self.dac
        plant.on_defect = self._on_defect

    def feed_watchdog(self):
        self._host.fed_at = self.plant.now

    def begin(self):
        """Wait for the host's first grant."""
        self._host.exchange()

    def _on_defect(self, kind, begins):
        if kind == "adc_not_converting":
            self.adc.stuck = begins
        else:
            chip = self.adc if kind == "adc_silent" else self.dac
            if begins:
                self.bus.chips.pop(self._addresses[kind])
            else:
                self.bus.chips[self._addresses[kind]] = chip


def _interpreter():
    name = {"micropython": "MicroPython", "cpython": "CPython"}[sys.implementation.name]
    return name + " " + ".".join(str(part) for part in sys.implementation.version[:3])


_board = None


def install(setup, pipe=None):
    """Make the board that `open_board` will hand out."""
    global _board
    _board = Board(setup, pipe or Pipe(_ROOM_BYTES))
    return _board


def open_board():
    _board.begin()
    return _board
