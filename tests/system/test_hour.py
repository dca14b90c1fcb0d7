"""An hour of the board's time with the memory that a small microcontroller leaves, and no growth in it.

RP2040: 264 kB of SRAM, of which MicroPython leaves its heap 192 KiB (both from memory). Objects of this 64-bit
interpreter are about twice as large as there: so the firmware is given twice 192 KiB, besides what the simulated
world holds. Tables of 16- and 32-bit numbers are not larger here: what the firmware holds at rest must fit into twice
192 KiB less its tables. The compiled firmware lies on that heap there: its byte code is counted; for speed the hour
itself runs the same files as machine code, which lies outside the heap, with as much less heap as the byte code takes.
"""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import pytest

from tests.system.fault_table.children import run_script, setup
from tests.system.fault_table.rows import SUPPLY

_BOARD_HEAP_BYTES = 192 * 1024
#: 4000 entries of the run log at 26 octets, and 2048 readings of a burst at 3.
_TABLE_BYTES = 4000 * 26 + 2048 * 3
_ALLOWED_BYTES = 2 * _BOARD_HEAP_BYTES
_PLENTY_BYTES = 4 << 20


def hour(folder: Path, heap_bytes: int, seconds: int, *, native: bool) -> dict[str, Any]:
    """What on_board/hour.py finds in so many seconds of the board's time."""
    path = folder / "setup.json"
    path.write_text(json.dumps(setup(SUPPLY, [])), encoding="utf-8")
    printed = run_script("hour.py", str(path), str(seconds), heap_bytes=heap_bytes, native=native)
    return json.loads(printed.splitlines()[-1])


@pytest.mark.timeout(900)
def test_an_hour_runs_in_the_heap_of_a_small_microcontroller_without_growing(tmp_path: Path) -> None:
    byte_code = hour(tmp_path, _PLENTY_BYTES, 1, native=False)
    machine_code = hour(tmp_path, _PLENTY_BYTES, 1, native=True)
    code = byte_code["firmware"] - machine_code["firmware"]
    limit = machine_code["world"] + _ALLOWED_BYTES - code
    found = hour(tmp_path, limit, 3600, native=True)
    assert byte_code["firmware"] < _ALLOWED_BYTES - _TABLE_BYTES
    assert found["refused"] == 0
    assert found["sinking"] > 3600 * 6  # of 8.5 looks a second
    held = found["held"]
    # From the second look on, every table has its size.
    assert len(held) == 11
    assert max(held[1:]) - min(held[1:]) < 4096, held
    assert held[-1] - held[1] < 1024, held
