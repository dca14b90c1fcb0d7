"""Runs a few lines under MicroPython with the true firmware on the stand-in board, and returns what they found.

The lines see `Session`, `Board`, `wire` and `struct`, and leave their finding in `found`, which comes back as JSON.
"""

from __future__ import annotations

import json
from pathlib import Path
from textwrap import dedent
from typing import Any

from tests.support.micropython import run_micropython
from tests.support.micropython32 import run_micropython32

_STAND_IN = Path(__file__).parent / "stand_in"
_MACHINE = Path(__file__).parent / "stand_in_machine"
_PRELUDE = """
import gc, json, micropython, struct
import wire
from stand_in_board import Board, Session, IMAGE
"""

# `sys` alone cannot be shadowed by a file on the path.
_RP2_PRELUDE = """
import json, micropython, sys
import board, machine, time, wire
from stand_in_board import IMAGE
from streams import Sys, WouldBlock
port = board.sys = Sys(sys.implementation)
IMAGE["pins"] = {"gate": 15, "led_red": 16, "led_green": 17, "trigger": None, "fan": None, "off_button": None}
IMAGE["i2c"] = {"id": 0, "scl": 5, "sda": 4, "frequency_Hz": 400_000}
"""


def on_board(lines: str, *, heapsize: str | None = None) -> Any:
    """Carry out `lines` on the board and return `found`."""
    return _found(run_micropython(_script(lines), heapsize=heapsize, extra_path=[_STAND_IN]))


def on_32_bit_board(lines: str) -> Any:
    """The same on an interpreter whose small integers have 31 bits, as the microcontroller's have.

    It has no `machine`, which board.py imports: that module is the stand-in's.
    """
    return _found(run_micropython32(_script(lines), extra_path=[_STAND_IN, _MACHINE]))


def on_rp2_board(lines: str) -> Any:
    """Carry out `lines` with the true board.py on the strict stand-ins for the port's modules.

    The lines see `board` (the module), `machine`, `time`, `port` (what board.py has for `sys`), `IMAGE` and `wire`.
    """
    script = _RP2_PRELUDE + dedent(lines) + "\nprint(json.dumps(found))\n"
    return _found(run_micropython(script, extra_path=[_MACHINE, _STAND_IN]))


def _script(lines: str) -> str:
    return _PRELUDE + dedent(lines) + "\nprint(json.dumps(found))\n"


def _found(printed: str) -> Any:
    return json.loads(printed.splitlines()[-1])
