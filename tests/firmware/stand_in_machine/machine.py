"""A strict stand-in for the RP2 port's `machine`: what the documentation does not allow, raises.

Written from MicroPython's documentation: "Quick reference for the RP2", "class Pin", "class I2C", "class WDT" and
"machine: functions related to the hardware". The pin assignment of the buses is that of the RP2040 datasheet, table 2
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
#: "Quick reference for the RP2", WDT: "the maximum value for timeout is 8388 ms".
_LONGEST_WATCHDOG_ms = 8388

made = []
#: What a test says that the microcontroller found at its start.
cause = PWRON_RESET


class Pin:
    IN = 0
    OUT = 1
    PULL_UP = 1

    def __init__(self, id, mode=-1, pull=-1, *, value=None):
        if type(id) is not int or not 0 <= id < _GPIOS:
            raise ValueError("invalid pin: " + str(id))
        if mode not in (-1, Pin.IN, Pin.OUT):
            raise ValueError("invalid pin mode: " + str(mode))
        if pull not in (-1, Pin.PULL_UP) or (pull == Pin.PULL_UP and mode != Pin.IN):
            raise ValueError("a pull is for an input")
        if mode == Pin.IN and pull == -1:
            raise ValueError("an input without a pull floats while nothing is connected")
        if value is not None and mode != Pin.OUT:
            raise ValueError("`value` is only for a pin that is an output")
        if mode == Pin.OUT and value is None:
            raise ValueError("an output without `value` starts at whatever level the pin had")
        self.number = id
        self.mode = mode
        # A pull-up shows high while nothing pulls down; a test sets the level of an input.
        self.level = value if mode == Pin.OUT else 1
        made.append(("Pin", id, mode, value))

    def value(self, level=None):
        if level is not None and self.mode != Pin.OUT:
            raise ValueError("the pin is no output")
        if level is None and self.mode == -1:
            raise ValueError("the pin is no input")
        if level is not None:
            self.level = 1 if level else 0
        return self.level if level is None else None


class PWM:
    """A pulse-width output; "class PWM": a duty of 65535 is all of a period."""

    def __init__(self, dest, *, freq, duty_u16):
        if type(dest) is not Pin or type(freq) is not int or type(duty_u16) is not int:
            raise TypeError("dest is a Pin, freq and duty_u16 integers")
        if not 8 <= freq <= 62_500_000:
            raise ValueError("freq out of range")
        self.duty_u16(duty_u16)
        made.append(("PWM", dest.number, freq, duty_u16))

    def duty_u16(self, value):
        if type(value) is not int or not 0 <= value <= 65535:
            raise ValueError("duty_u16 must be from 0 to 65535")
        self.duty = value


#: What the analogue inputs read, by GPIO.
analogue = {}


class ADC:
    """An analogue input; "class ADC": 16 bits, whatever the converter's own resolution."""

    def __init__(self, id):
        if type(id) is not Pin or not 26 <= id.number <= 29:
            raise ValueError("Pin doesn't have ADC capabilities")
        self.number = id.number
        made.append(("ADC", id.number))

    def read_u16(self):
        return analogue[self.number]


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

    def readfrom_into(self, addr, buf, stop=True):
        self._transfer(addr, 1 + len(buf))

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


class WDT:
    """Once started it cannot be stopped, and a second one would be another period for the same timer."""

    started = None

    def __init__(self, id=0, timeout=5000):
        if id != 0 or type(timeout) is not int:
            raise ValueError("there is one watchdog, and its timeout is an integer")
        if not 0 < timeout <= _LONGEST_WATCHDOG_ms:
            raise ValueError("timeout exceeds " + str(_LONGEST_WATCHDOG_ms))
        if WDT.started is not None:
            raise RuntimeError("the watchdog already runs, and nothing stops it")
        WDT.started = self
        self.timeout_ms = timeout
        self.fed = 0

    def feed(self):
        self.fed += 1


class WasReset(BaseException):
    """Where the true microcontroller would begin anew."""


def reset():
    raise WasReset


def unique_id():
    return b"\xe6\x61\x41\x04\x03\x2b\x1c\x28"


def reset_cause():
    return cause
