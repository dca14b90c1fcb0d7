"""Runs a few lines under MicroPython with the true firmware on the stand-in board, and returns what they found.

The lines see `Session`, `Board`, `wire` and `struct`, and leave their finding in `found`, which comes back as JSON.
"""

from __future__ import annotations

import json
from pathlib import Path
from textwrap import dedent
from typing import Any

from tests.support.micropython import run_micropython

_PRELUDE = """
import gc, json, micropython, struct
import wire
from stand_in_board import Board, Session, IMAGE
"""


def on_board(lines: str, *, heapsize: str | None = None) -> Any:
    """Carry out `lines` on the board and return `found`."""
    script = _PRELUDE + dedent(lines) + "\nprint(json.dumps(found))\n"
    printed = run_micropython(script, heapsize=heapsize, extra_path=[Path(__file__).parent / "stand_in"])
    return json.loads(printed.splitlines()[-1])
