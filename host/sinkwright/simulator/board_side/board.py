"""The simulated board: the one firmware file that is replaced. Same seam, a simulated world.

Time advances only in `clock.wait_until` and by the duration of bus transactions, and only as far as the host
has granted. Everything is handed over by the first line on the standard input (see start.py); nothing here
looks at a wall clock, so the same seed gives the same bytes.
"""

import gc
import sys

from micropython import const

import chip_ads1115
import chip_ina226
import chip_mcp4725
import chip_rp2
from memory_slots import Store
from noise import Noise
from pipe import Pipe
from plant import Plant

# errno of a transaction that nobody acknowledges: EIO, as the RP2 port raises it.
_EIO = 5
# A bus that is held: the time-out that the real board.py asks for, and what the port then raises.
_TIMEOUT_us = 2_000
_ETIMEDOUT = 110
# The USB device's buffer of the real board.
_ROOM_BYTES = 256
_LONGEST_TRANSFER = 64
# The RP2's ticks wrap there.
_TICKS_MASK = const((1 << 30) - 1)
_HALF_TICKS = const(1 << 29)
# The RP2's watchdog cannot be made to wait longer than 8388 ms; what the real board.py asks for; later than ever.
_WATCHDOG_us = 2_000_000
_NEVER_us = 1 << 60
# As long as the real board.py waits, so that what was written last gets out.
_LAST_WORDS_us = 100_000
# Until the firmware's first line runs again after a reset: an estimate.
_RESET_us = 300_000
_POWER_ON = 1
_BY_WATCHDOG = 2


class Reset(BaseException):
    """The microcontroller starts anew while the world goes on; nothing in the firmware catches it."""


class Clock:
    """Ticks in microseconds, which wrap at 2**30 as the RP2 port's do: only differences mean anything."""

    def __init__(self, plant, host, first_ticks):
        self._plant = plant
        self._host = host
        self._first = first_ticks

    def ticks_us(self):
        return self._plant.now + self._first & _TICKS_MASK

    def since(self, earlier):
        return (self._plant.now + self._first - earlier + _HALF_TICKS & _TICKS_MASK) - _HALF_TICKS

    def add(self, ticks, us):
        return ticks + us & _TICKS_MASK

    def wait_until(self, ticks):
        """Idle until `ticks`; what was written leaves first, at the time it was written."""
        host = self._host
        if host.pipe.out_count:
            host.exchange()
        plant = self._plant
        now = plant.now
        until = now + (ticks - now - self._first + _HALF_TICKS & _TICKS_MASK) - _HALF_TICKS
        bites = until > host.bites_at
        if bites:
            until = host.bites_at
        while until > host.granted_until:
            plant.now = max(plant.now, host.granted_until)
            if plant.now >= plant.due:
                plant.catch_up()
            host.exchange()
        if until > plant.now:
            plant.now = until
            if until >= plant.due:
                plant.catch_up()
        if bites:
            host.bite()


class Bus:
    """I2C with machine.I2C's signatures; each transaction takes its time on the wire."""

    def __init__(self, plant, frequency_Hz):
        self._plant = plant
        self.chips = {}
        self._present = {}
        self._stuck = False
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
            self._fail()
        chip.read_register(register, buffer)

    def readfrom_into(self, address, buffer):
        plant = self._plant
        plant.now = now = plant.now + self._write_us[len(buffer)]
        if now >= plant.due:
            plant.catch_up()
        chip = self.chips.get(address)
        if chip is None:
            self._fail()
        chip.read(buffer)

    def writeto_mem(self, address, register, buffer):
        plant = self._plant
        plant.now = now = plant.now + self._write_us[len(buffer) + 1]
        if now >= plant.due:
            plant.catch_up()
        chip = self.chips.get(address)
        if chip is None:
            self._fail()
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
            self._fail()
        chip.write(buffer)

    def hold_low(self, stuck):
        """A line is held low by something: nobody is heard, and each transaction runs into its time-out."""
        self._stuck = stuck
        self._present, self.chips = self.chips, {} if stuck else self._present

    def _fail(self):
        if not self._stuck:
            raise OSError(_EIO)
        self._plant.now += _TIMEOUT_us
        raise OSError(_ETIMEDOUT)


class Gate:
    """Clamped at power-up, as the passive pull does it."""

    def __init__(self, plant):
        self._plant = plant
        self._clamped = True
        self._pulled = False

    def clamp(self):
        self._clamped = True
        self._plant.set_gate(True)

    def release(self):
        self._clamped = False
        self._plant.set_gate(self._pulled)

    def pull(self, down):
        """Something else than the microcontroller's pin holds it clamped, or lets go."""
        if down != self._pulled:
            self._pulled = down
            self._plant.set_gate(self._clamped or down)


class Led:
    def __init__(self):
        self.shown = -1
        self.lit = False

    def show(self, state, lit=True):
        self.shown = state
        self.lit = lit


class Watchdog:
    """The RP2's: it runs from its start on, and nothing stops it but a reset."""

    def __init__(self, plant, host):
        self._plant = plant
        self._host = host
        self._runs = False

    def start(self):
        self._runs = True
        self.feed()

    def feed(self):
        if self._runs:
            self._host.bites_at = self._plant.now + _WATCHDOG_us

    def reset(self):
        self._runs = False
        self._host.bites_at = _NEVER_us


class Trigger:
    """The output for an oscilloscope; on this board nobody listens."""

    def __init__(self):
        self.level = 0

    def set(self, level):
        self.level = 1 if level else 0


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
        self.bites_at = _NEVER_us
        self.bite = None  # the board's, see there
        self._first = True

    def exchange(self):
        plant = self._plant
        if self._first:
            # Before the first grant nothing has run, so there is nothing to answer.
            self._first = False
        else:
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
        self.reset_cause = setup.get("reset_cause") or _POWER_ON
        self.maintenance = False
        self.boot_number = 0
        self.interpreter = setup.get("interpreter") or _interpreter()
        self.plant = plant = Plant(entry, setup["source"])
        self._host = Host(plant, pipe)
        self._host.bite = self._bite
        self.clock = Clock(plant, self._host, setup.get("first_ticks") or 0)
        self.bus = Bus(plant, image["i2c"]["frequency_Hz"])
        self.gate = Gate(plant)
        self.led = Led()
        self.trigger = Trigger()
        self.store = Store(setup.get("memory"))
        self.watchdog = Watchdog(plant, self._host)
        self.fan_on = False
        self.off_pressed = False
        self.stream = Stream(self._host)
        noise = Noise(setup["seed"], entry["adc"]["noise_counts"] * 65536.0)
        self.pins = chip_rp2.Pins(entry, plant, noise)
        self.adc = self.dac = None
        if entry.get("monitor"):
            self.pins.monitor = chip_ina226.Chip(entry["monitor"], plant, self.gate)
            self.bus.chips[entry["monitor"]["address"]] = self.pins.monitor
        self._addresses = {"adc_silent": entry["adc"]["address"], "dac_silent": entry["dac"]["address"]}
        if entry["adc"]["part"] == "ADS1115":
            self.adc = chip_ads1115.Chip(entry["adc"], plant, noise)
            self.bus.chips[entry["adc"]["address"]] = self.adc
        if entry["dac"]["part"] == "MCP4725":
            self.dac = chip_mcp4725.Chip(entry["dac"], plant)
            self.bus.chips[entry["dac"]["address"]] = self.dac
        plant.arm(self._on_defect)

    def button(self):
        return self.off_pressed

    def fan(self, on):
        self.fan_on = on

    def restart(self, maintenance, cause):
        self.clock.wait_until(self.clock.add(self.clock.ticks_us(), _LAST_WORDS_us))
        self._reset(maintenance, cause)

    def _bite(self):
        self._reset(False, _BY_WATCHDOG)

    def _reset(self, maintenance, cause):
        """Pins let go, so the gate is clamped; the chips keep what they were told."""
        self.gate.clamp()
        self.watchdog.reset()
        self.maintenance = bool(maintenance)
        self.reset_cause = cause
        raise Reset

    def start_again(self):
        """The time until the firmware runs again; what comes in meanwhile is lost."""
        self.clock.wait_until(self.clock.add(self.clock.ticks_us(), _RESET_us))
        self._host.incoming = b""

    def begin(self):
        """Wait for the host's first grant."""
        self._host.exchange()

    def _on_defect(self, kind, begins):
        if kind == "bus_stuck_low":
            self.bus.hold_low(begins)
            return
        chip = self.adc if kind.startswith("adc_") else self.dac
        if kind.endswith("_silent"):
            if begins:
                self.bus.chips.pop(self._addresses[kind])
            else:
                self.bus.chips[self._addresses[kind]] = chip
        else:
            chip.set_defect(kind[4:], begins)


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
