"""A simulated board without tolerances, for checks against closed forms; runs under MicroPython and CPython.

`plant(**changes)` and `world(source, **changes)` take replacements for top-level keys of the plant's JSON.
"""

import math

# R = R25*exp(A + B/T + C/T^2 + D/T^3), Vishay NTCLE100E3 (doc 29049), coefficients as in reference.md
# section 3.
NTC = (-14.6337, 4791.842, -115334.0, -3.730535e6)

IMAGE = {
    "image": 1,
    "name": "nominal",
    "board_file_crc": 0,
    "period_us": 2350,
    "i2c": {"id": 0, "scl": 5, "sda": 4, "frequency_Hz": 400_000},
}


def ntc_ohm(degC):
    t = 273.15 + degC
    a, b, c, d = NTC
    return 10_000.0 * math.exp(a + b / t + c / t / t + d / t / t / t)


def plant(**changes):
    made = {
        "dac": {"part": "MCP4725", "address": 0x60, "reference_V": 3.3, "inl": []},
        "adc": {
            "part": "ADS1115",
            "address": 0x48,
            "supply_V": 3.3,
            "gain": 1.0,
            "offset_counts": 0.0,
            "noise_counts": 0.0,
            "window": 1.0,
            "inputs": {"current": 0, "voltage": 1, "force": 2, "heatsink": 3},
        },
        "current": {
            "resistance_ohm": 0.025,
            "gain": 25.0,
            "offset_V": 0.0,
            "pedestal_V": 0.1,
            "rail_V": 3.28,
        },
        "voltage": {"ratio": 11.0, "offset_V": 0.0, "pedestal_V": 0.1, "rail_V": 3.28},
        "force": {"ratio": 11.0, "offset_V": 0.0, "pedestal_V": 0.1, "rail_V": 3.28},
        "setpoint_offset_V": 0.0,
        "sense_pair": True,
        "loop": {"bandwidth_Hz": 5000.0, "rail_A": 44.0},
        "transistor": {"on_resistance_ohm": 0.05, "stages": [[0.3, 0.001], [0.7, 0.03]]},
        "case_to_sink": [0.5, 0.5],
        "heatsink": [2.5, 300.0],
        "ambient_degC": 25.0,
        "thermistor": {
            "supply_V": 3.3,
            "pullup_ohm": 10_000.0,
            "table": [[t, ntc_ohm(t)] for t in range(-40, 155, 5)],
        },
    }
    made.update(changes)
    return made


class World:
    """A board without firmware and host: the test moves the time and drives the chips."""

    def __init__(self, source, **changes):
        import board

        setup = {
            "image": IMAGE,
            "plant": plant(**changes),
            "source": source,
            "seed": 1,
            "board_id": "0011223344556677",
        }
        self.board = board.Board(setup, _NoPipe())
        self.board.clock.wait_until(0)
        self.plant = self.board.plant
        self.bus = self.board.bus
        self._word = bytearray(2)

    def run_s(self, seconds):
        clock = self.board.clock
        rest_us = int(seconds * 1e6 + 0.5)
        while rest_us:
            # Ticks that wrap tell no more than half a round.
            part_us = min(rest_us, 1 << 28)
            clock.wait_until(clock.add(clock.ticks_us(), part_us))
            rest_us -= part_us
        self.plant.catch_up()

    def demand(self, ampere):
        """The DAC code next to `ampere`, written; returns the current it truly asks for."""
        code = int((0.1 + 0.625 * ampere) / 3.3 * 4096 + 0.5)
        self.bus.writeto(0x60, bytes([code >> 8, code & 0xFF]))
        return (code * 3.3 / 4096 - 0.1) / 0.625

    def sink(self, ampere):
        """As the firmware goes about it: DAC at nothing, gate released, then the demand."""
        self.demand(-0.16)
        self.board.gate.release()
        return self.demand(ampere)

    def convert(self, pin, gain_bits=1, rate_bits=7):
        """One conversion, waited for: the register's word as signed counts."""
        self.begin(pin, gain_bits, rate_bits)
        return self.finish(rate_bits)

    def begin(self, pin, gain_bits=1, rate_bits=7):
        config = 0xC103 | pin << 12 | gain_bits << 9 | rate_bits << 5
        self.bus.writeto_mem(0x48, 1, bytes([config >> 8, config & 0xFF]))

    def finish(self, rate_bits=7):
        self.run_s(1.2 / (8, 16, 32, 64, 128, 250, 475, 860)[rate_bits])
        self.bus.readfrom_mem_into(0x48, 0, self._word)
        counts = self._word[0] << 8 | self._word[1]
        return counts - 0x10000 if counts & 0x8000 else counts

    def voltage_V(self):
        return (self.convert(1) * 125e-6 - 0.1) * 11.0

    def current_A(self):
        return (self.convert(0) * 125e-6 - 0.1) / 0.625

    def look(self):
        """Bring every state to this moment; a world at rest is otherwise left alone for a while."""
        self.plant.disturb(1)

    def junction_degC(self):
        self.look()
        return self.plant.heat.junction_degC


class _NoPipe:
    """Grants all the time there is."""

    out_count = 0

    def answer(self, now_us):
        pass

    def grant(self):
        return 1 << 50, b""


def near(value, expected, tolerance):
    assert abs(value - expected) <= tolerance, (value, expected, tolerance)
