"""A stand-in for `time` with the RP2 port's ticks, which wrap at 2**30, and a clock that a test moves.

Written from MicroPython's documentation of ticks_us, ticks_add and ticks_diff. Reading the clock costs time too,
as every loop that waits for it relies on.
"""

_PERIOD = 1 << 30
_HALF = _PERIOD // 2
_READING_us = 1

_now = 0


def set_us(ticks):
    global _now
    _now = ticks % _PERIOD


def pass_us(us):
    set_us(_now + us)


def ticks_us():
    pass_us(_READING_us)
    return _now


def ticks_add(ticks, delta):
    _in_range(ticks)
    if not -_HALF < delta < _HALF:
        raise OverflowError("ticks interval overflow")
    return (ticks + delta) % _PERIOD


def ticks_diff(ticks1, ticks2):
    _in_range(ticks1)
    _in_range(ticks2)
    return (ticks1 - ticks2 + _HALF) % _PERIOD - _HALF


def _in_range(ticks):
    if not 0 <= ticks < _PERIOD:
        raise ValueError("no ticks value: only ticks_us and ticks_add give one")
