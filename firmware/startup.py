"""From power-up to the first turn of the loop, and from the loop's end to the next start.

`start` hands out a firmware that has tested itself, or one that says why it stays off. `leave` decides what follows
when the loop is left: a restart for maintenance, where no watchdog bites a copy of files half done, or the prompt
when that has been tried already. The gate is clamped throughout.
"""

import io
import sys

from micropython import const

import selftest
import wire
from safe_image import SAFE_IMAGE
from store import Store

_STOPPED_BY = "stopped_by"
_LONGEST_REASON = const(70)

# What a constructor raises on an image that passed the checks by kind and range and still makes no sense.
_UNUSABLE = (KeyError, ValueError, TypeError, IndexError, OverflowError, ZeroDivisionError)


class Restart(Exception):
    """Asked for by a host; `maintenance` says for which boot."""

    def __init__(self, maintenance):
        self.maintenance = maintenance


def start(board, make):
    """A firmware made by `make(board)`, tested, its boot counted, its time begun."""
    firmware, code, wrong = _made(board, make)
    if not code:
        code, wrong = selftest.run(board, firmware.store, firmware.dac, firmware.adc, firmware.monitor)
    try:
        _count_boot(board, firmware.store)
    except (OSError, ValueError) as error:
        if not code:
            code, wrong = wire.SELF_TEST_STORE, "the store cannot be written: " + repr(error)
    if code:
        firmware.self_test = code
        firmware.why_off = "self-test: " + wrong
        print(firmware.why_off)
        firmware.guard.latch(wire.FAULT_SELF_TEST, code, 0)
    elif board.reset_cause == wire.RESET_EXCEPTION:
        firmware.why_off = "the firmware had stopped: " + firmware.store.get(_STOPPED_BY, "reason not kept")
        firmware.guard.latch(wire.FAULT_EXCEPTION, 0, 0)
    firmware.time.begin()
    return firmware


def _made(board, make):
    """(firmware, code, sentence); on the safe image where the board's own is no good."""
    wrong = selftest.check_image(board.image)
    if not wrong:
        try:
            return make(board), wire.SELF_TEST_PASSED, ""
        except _UNUSABLE as error:
            wrong = "nothing can be made of the board file: " + repr(error)
    board.image = SAFE_IMAGE
    return make(board), wire.SELF_TEST_IMAGE, wrong


def _count_boot(board, store):
    boots = (store.get("boots", 0) + 1) & 0xFFFFFFFF
    store.put("boots", boots)
    board.boot_number = boots


class _Clamped:
    """What the store asks: whether the load is on."""

    state = wire.STATE_OFF


def _keep(board, text):
    """For the host that comes hours later. Whatever is broken, the restart must not fail for it."""
    try:
        Store(board.store, _Clamped).put(_STOPPED_BY, text[:_LONGEST_REASON])
    except Exception as error:
        print("the reason cannot be kept: " + repr(error))


class _Trace(io.IOBase):
    """A traceback as text, which then goes the way of every `print`."""

    def __init__(self):
        self.text = ""

    def write(self, data):
        self.text += bytes(data).decode()
        return len(data)


def leave(board, error):
    """What follows when `error` has left the loop; the caller has clamped the gate."""
    asked = isinstance(error, Restart)
    crashed = not asked and not isinstance(error, KeyboardInterrupt)
    # Off already: what is left to do may take longer than a turn.
    board.watchdog.feed()
    if crashed:
        _keep(board, repr(error))
        print("the firmware stopped, the gate is clamped: " + repr(error))
        trace = _Trace()
        sys.print_exception(error, trace)
        print(trace.text)
    elif not asked:
        print("stopped by Ctrl-C: the gate is clamped")
    if board.maintenance and not asked:
        return
    maintenance = error.maintenance if asked else True
    board.restart(maintenance, wire.RESET_EXCEPTION if crashed else wire.RESET_SOFT)
