"""A board for tests that run under MicroPython: the true firmware above, numbers that a test sets below.

Its bus answers as the two chips do, at register level, with the counts a test has put in `counts`; its clock moves
only when a step is waited for. Nothing in it allocates during a control step, so that what a heap check finds is
the firmware's. It is not the simulated board, which has physics; this one has none.
"""

import errno

import wire

ADC = 0x48
DAC = 0x60


class Clock:
    def __init__(self):
        self.now = 0
        self.stall_us = 0

    def ticks_us(self):
        return self.now

    def add(self, ticks, us):
        return ticks + us

    def since(self, earlier):
        return self.now - earlier

    def wait_until(self, ticks):
        if ticks > self.now:
            self.now = ticks
        self.now += self.stall_us
        self.stall_us = 0


class Bus:
    def __init__(self, clock):
        self._clock = clock
        self._begun_at = -1
        #: Whether a conversion that is begun is under way until time passes.
        self.starting = True
        self.counts = [0, 0, 0, 0]
        self.code = -1
        self.memory = 0
        self.follow = False
        self.silent = 0
        self.converting = True
        self.ready = True
        self._config_high = 0x85
        self._config_low = 0x83

    def writeto_mem(self, address, register, data):
        self._answer(address, ADC)
        if self.converting:
            self._config_high = data[0]
        self._config_low = data[1]
        if self.starting:
            self._begun_at = self._clock.now

    def readfrom_mem_into(self, address, register, buffer):
        self._answer(address, ADC)
        if register == 1:
            ready = self.ready and self._clock.now != self._begun_at
            buffer[0] = self._config_high if ready else self._config_high & 0x7F
            buffer[1] = self._config_low
        else:
            counts = self.counts[self._config_high >> 4 & 3] & 0xFFFF
            buffer[0] = counts >> 8
            buffer[1] = counts & 0xFF

    def readfrom_into(self, address, buffer):
        """The DAC's five octets: ready, its output, its power-up memory."""
        self._answer(address, DAC)
        code = max(self.code, 0)
        for at, octet in enumerate((0xC0, code >> 4, code << 4 & 0xF0, self.memory >> 8, self.memory & 0xFF)):
            buffer[at] = octet

    def writeto(self, address, data):
        self._answer(address, DAC)
        if len(data) == 3:
            self.code = self.memory = data[1] << 4 | data[2] >> 4
            return
        self.code = data[0] << 8 | data[1]
        if self.follow:
            self.counts[0] = 800 + max(self.code - 124, 0) * 12890 // 2000

    def _answer(self, address, chip):
        if address != chip or self.silent == address:
            raise OSError(errno.ENODEV)


class Gate:
    def __init__(self):
        self.released = None

    def clamp(self):
        self.released = False

    def release(self):
        self.released = True


class Led:
    def show(self, state, lit=True):
        self.state = state
        self.lit = lit


class Slots:
    """The store's medium; a write is cut off after `cut` octets, as when the power goes, and then raises."""

    def __init__(self):
        self.slots = [b"", b""]
        self.writes = 0
        self.cut = None

    def read(self, slot):
        return self.slots[slot]

    def write(self, slot, data):
        self.writes += 1
        if self.cut is None:
            self.slots[slot] = bytes(data)
            return
        # What the old write held beyond the cut is still there, as in a file that is written in place.
        self.slots[slot] = bytes(data[: self.cut]) + self.slots[slot][self.cut :]
        raise PowerLost


class PowerLost(Exception):
    """No firmware could notice this."""


class Watchdog:
    def __init__(self):
        self.started = False
        self.fed = 0

    def start(self):
        self.started = True

    def feed(self):
        self.fed += 1


class Trigger:
    """Keeps [board time, level] of every change."""

    def __init__(self, clock):
        self._clock = clock
        self.level = 0
        self.edges = []

    def set(self, level):
        level = 1 if level else 0
        if level != self.level:
            self.level = level
            self.edges.append([self._clock.now, level])


class Stream:
    def __init__(self):
        self.incoming = b""
        self.outgoing = b""
        self.space = 256

    def read_into(self, buffer):
        count = min(len(buffer), len(self.incoming))
        if count:
            buffer[:count] = self.incoming[:count]
            self.incoming = self.incoming[count:]
        return count

    def room(self):
        return self.space

    def write(self, data):
        self.outgoing += bytes(data)
        return len(data)


IMAGE = {
    "image": 1,
    "name": "stand-in",
    "board_file_crc": 0x12345678,
    "period_us": 2350,
    "pins": {},
    "i2c": {},
    "dac": {"part": "MCP4725", "address": DAC, "zero_code": 124, "uA_per_code_x64": 82500, "full_code": 4095},
    "adc": {
        "part": "ADS1115",
        "address": ADC,
        "gain_bits": 1,
        "rate_bits": 7,
        "conversion_us": 1300,
        "inputs": {"current": 0, "voltage": 1, "force": 2, "heatsink": 3},
    },
    "scales": {
        "current": {"zero_counts": 800, "whole": 200, "part": 0},
        "voltage": {"zero_counts": 800, "whole": 1375, "part": 0},
        "force": {"zero_counts": 800, "whole": 1375, "part": 0},
    },
    "thermistor": {
        "counts": [1000, 4000, 13200, 20000, 25000],
        "mC": [125000, 80000, 25000, 0, -20000],
        "open_counts": 26000,
        "short_counts": 500,
    },
    "thermal": {
        "stages": [
            {"r_mK_per_W": 300, "every_steps": 2, "share_x32768": 32470},
            {"r_mK_per_W": 500, "every_steps": 2, "share_x32768": 1210},
        ]
    },
    "limits": {
        "current_uA": 4_000_000,
        "voltage_uV": 30_000_000,
        "power_uW": 40_000_000,
        "heatsink_mC": 85_000,
        "junction_mC": 125_000,
        "slew_uA_per_ms": 400_000,
        "silence_ms": 3_000,
    },
    "zero_budget_uA": 50_000,
    "off_current_uA": 60_000,
    "demand_margin_uA": 150_000,
    "hard_counts": {"current": 23_200, "voltage": 22_900, "force": 23_400, "heatsink": 3_333},
    "calibration": {
        "current": {"gain_ppm": 16_000, "zero_counts": 65},
        "voltage": {"gain_ppm": 6_000, "zero_counts": 60},
        "force": {"gain_ppm": 24_000, "zero_counts": 85},
    },
    "sense": {"fixed_uV": 240_000, "share_x1024": 26, "lead_mohm": 500, "short_mohm": 650},
    "cooling": {
        "most": {"r_mK_per_W": 1339, "warm": [6925, 8], "cool": [4098, 8]},
        "still": {"r_mK_per_W": 6695, "warm": [5543, 10], "cool": [6560, 11]},
        "least": {"r_mK_per_W": 747, "warm": [7346, 8], "cool": [6208, 7]},
        "drift_uK": 431,
        "allowance_mK": 6_000,
        "coldest_mC": 5_000,
    },
}


class Board:
    simulated = True
    board_id = b"stand-in"
    boot_number = 7
    reset_cause = wire.RESET_POWER_ON
    interpreter = "test"

    def __init__(self, **changes):
        self.image = dict(IMAGE)
        self.image.update(changes)
        self.clock = Clock()
        self.bus = Bus(self.clock)
        self.gate = Gate()
        self.led = Led()
        self.trigger = Trigger(self.clock)
        self.stream = Stream()
        self.store = Slots()
        self.watchdog = Watchdog()
        self.maintenance = False
        self.pressed = False
        self.fan_on = None
        self.restarts = []
        self.show(0, 12_000_000, 25_000)

    def button(self):
        return self.pressed

    def fan(self, on):
        self.fan_on = on

    def restart(self, maintenance, cause):
        self.restarts.append([bool(maintenance), cause])

    def show(self, current_uA, voltage_uV, heatsink_mC=None):
        """Make the converter find these; a current of None is whatever the DAC asks for, as with a good source."""
        self.bus.follow = current_uA is None
        if current_uA is not None:
            self.bus.counts[0] = 800 + current_uA // 200
        self.bus.counts[1] = self.bus.counts[2] = 800 + voltage_uV // 1375
        if heatsink_mC is not None and heatsink_mC <= 80_000:
            self.bus.counts[3] = 13200 - (heatsink_mC - 25_000) * 9200 // 55_000
        elif heatsink_mC is not None:
            self.bus.counts[3] = 4000 - (heatsink_mC - 80_000) * 3000 // 45_000


class Session:
    """A firmware on a stand-in board, spoken to without a wire: what `dispatch` does with a frame's content."""

    def __init__(self, board=None, **changes):
        """On `board`, which then tests itself as at its start; or on one of its own, with `changes` of the image."""
        import main
        import startup

        self.board = board or Board(**changes)
        self.firmware = startup.start(board, main.Firmware) if board else main.Firmware(self.board)
        self.sequence = 0
        self.sent = []
        self.firmware.link.send = self._keep
        self.firmware.link.poll = self._next
        self._queue = []

    def _keep(self, message, session, sequence, payload):
        self.sent.append((message, session, sequence, bytes(payload)))
        return True

    def _next(self):
        return self._queue.pop(0) if self._queue else None

    def turns(self, count):
        for _ in range(count):
            self.firmware.turn()

    def ask(self, message, payload=b"", session=1, sequence=None, version=None):
        """Send one command and return the reply's (id, payload)."""
        import struct

        if sequence is None:
            self.sequence += 1
            sequence = self.sequence
        version = wire.VERSION if version is None else version
        self._queue.append(
            struct.pack(wire.HEADER_FORMAT, version, message, session, sequence, len(payload)) + payload
        )
        del self.sent[:]
        self.firmware.turn()
        for reply, to, number, content in self.sent:
            if to == session and number == sequence:
                return reply, content
        return None

    def refusal(self, *arguments, **more):
        """The refusal code (None if not refused), with detail and field."""
        import struct

        reply = self.ask(*arguments, **more)
        if reply is None or reply[0] != wire.REFUSED:
            return None
        return list(struct.unpack(wire.REFUSED_FORMAT, reply[1])[1:])

    def take_control(self):
        self.ask(wire.HELLO, bytes([wire.VERSION, 0]))
        self.turns(160)

    def sink(self, current_uA, when_silent=wire.SILENCE_STOP, run=0):
        """From nothing to sinking `current_uA`, the converter showing it."""
        import struct

        self.take_control()
        self.ask(wire.SET_POINT, struct.pack(wire.SET_POINT_FORMAT, wire.MODE_CURRENT, current_uA))
        self.board.show(None, 12_000_000)
        self.ask(wire.ENABLE, struct.pack(wire.ENABLE_FORMAT, when_silent, run, 0))
        self.turns(24)
