"""A strict stand-in for the RP2 port's `machine`: what the documentation does not allow, raises.

Written from MicroPython's documentation: "Quick reference for the RP2", "class Pin", "class I2C" and "machine:
functions related to the hardware". The pin assignment of the buses is that of the RP2040 datasheet, table 2
(GPIO functions). Only what board.py may use exists. `made` lists what was constructed, in order.
"""

import time

PWRON_RESET = 1
WDT_RESET = 3

_GPIOS = 30
#: Fast-mode plus; the port's documentation gives 400 kHz as the default, the datasheet 1 MHz as the end.
_FASTEST_Hz = 1_000_000
_ETIMEDOUT = 110
_EIO = 5

made = []
#: What a test says that the microcontroller found at its start.
cause = PWRON_RESET


class Pin:
    IN = 0
    OUT = 1

    def __init__(self, id, mode=-1, pull=-1, *, value=None):
        if type(id) is not int or not 0 <= id < _GPIOS:
            raise ValueError("invalid pin: " + str(id))
        if mode not in (-1, Pin.IN, Pin.OUT):
            raise ValueError("invalid pin mode: " + str(mode))
        if value is not None and mode != Pin.OUT:
            raise ValueError("`value` is only for a pin that is an output")
        if mode == Pin.OUT and value is None:
            raise ValueError("an output without `value` starts at whatever level the pin had")
        self.number = id
        self.mode = mode
        self.level = value
        made.append(("Pin", id, mode, value))

    def value(self, level):
        if self.mode != Pin.OUT:
            raise ValueError("the pin is no output")
        self.level = 1 if level else 0


class I2C:
    """A bus whose transfers take their time. `present` are the addresses that acknowledge; `held` is a clock line
    that somebody keeps low: a transfer then takes the whole time-out and fails."""

    def __init__(self, id, *, scl, sda, freq=400_000, timeout=50_000):
        if type(scl) is not Pin or type(sda) is not Pin or type(freq) is not int or type(timeout) is not int:
            raise TypeError("scl and sda are Pins, freq and timeout integers")
        if id not in (0, 1):
            raise ValueError("I2C(" + str(id) + ") doesn't exist")
        if scl.number & 1 != 1 or scl.number >> 1 & 1 != id:
            raise ValueError("bad SCL pin")
        if sda.number & 1 != 0 or sda.number >> 1 & 1 != id:
            raise ValueError("bad SDA pin")
        if not 0 < freq <= _FASTEST_Hz:
            raise ValueError("bad frequency")
        if timeout <= 0:
            raise ValueError("bad timeout")
        self.frequency_Hz = freq
        self.timeout_us = timeout
        self.present = ()
        self.held = False
        made.append(("I2C", id, scl.number, sda.number, freq, timeout))

    def writeto(self, addr, buf, stop=True):
        self._transfer(addr, 1 + len(buf))
        return len(buf)

    def writeto_mem(self, addr, memaddr, buf, *, addrsize=8):
        self._transfer(addr, 2 + len(buf))

    def readfrom_mem_into(self, addr, memaddr, buf, *, addrsize=8):
        self._transfer(addr, 3 + len(buf))

    def _transfer(self, address, octets):
        """Nine bits an octet, start and stop; UM10204 section 3.1."""
        if not 0x08 <= address <= 0x77:
            raise ValueError("reserved address")
        if self.held:
            time.pass_us(self.timeout_us)
            raise OSError(_ETIMEDOUT)
        if address not in self.present:
            time.pass_us(11 * 1_000_000 // self.frequency_Hz)
            raise OSError(_EIO)
        time.pass_us((9 * octets + 2) * 1_000_000 // self.frequency_Hz)


def unique_id():
    return b"\xe6\x61\x41\x04\x03\x2b\x1c\x28"


def reset_cause():
    return cause
