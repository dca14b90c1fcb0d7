"""The control step's time budget: what it puts on the bus, how many operations MicroPython carries out for it, and
from both the shortest control period to be expected of a 125 MHz Cortex-M0+.

Bus: transactions and bits are counted as the firmware makes them. Operations: which lines of the firmware run in each
control period is traced under CPython; how many operations a line has is taken from MicroPython's own listing of its
byte code (`-v -v`). A line with a branch in it counts whole, so the figure is high rather than low.
"""

from __future__ import annotations

import json
import re
import subprocess
import sys
from collections import defaultdict
from pathlib import Path
from statistics import fmean
from typing import Any

from sinkwright.firmware_files import find_firmware
from sinkwright.simulator.interpreter import find_interpreter
from tests.system.fault_table.children import BOARD_SIDE, ON_BOARD, setup
from tests.system.fault_table.rows import SUPPLY

#: An estimate, from memory of loops timed on such boards (0.4 us for the simplest operations, several for a call),
#: not a measurement of this firmware: to be replaced by one on the first real board.
US_PER_OPERATION = 1.0
PERIOD_us = 2350
#: One conversion of the slowest ADS1115: 860/s less 10 % (from memory: SBAS444).
CONVERSION_us = 1e6 / 860 / 0.9
_ROUND = 66
_SET_POINTS = {
    "current": (1, 1_000_000),
    "power": (2, 10_000_000),
    "resistance": (3, 12_000),
    "voltage": (4, 11_950_000),
}
_BLOCK = re.compile(r"^File (.+), code block")
_LINE = re.compile(r"^ +bc=(\d+) line=(\d+)")
_OPERATION = re.compile(r"^(\d+) [A-Z_]+")


def operations_by_line() -> dict[str, dict[int, int]]:
    """File (below the firmware folder): line: operations, from MicroPython's listing."""
    firmware = find_firmware()
    command = find_interpreter(native=False).command
    found: dict[str, dict[int, int]] = {}
    for path in sorted(firmware.rglob("*.py")):
        listing = subprocess.run(
            [*command, "-v", "-v", "-X", "compile-only", str(path)],
            capture_output=True,
            text=True,
            check=True,
        ).stdout
        found[str(path.relative_to(firmware))] = _count(listing)
    return found


def _count(listing: str) -> dict[int, int]:
    counts: dict[int, int] = defaultdict(int)
    starts: list[tuple[int, int]] = []
    for text in listing.splitlines():
        if _BLOCK.match(text):
            starts = []
        elif match := _LINE.match(text):
            starts.append((int(match[1]), int(match[2])))
        elif (match := _OPERATION.match(text)) and starts:
            counts[[line for at, line in starts if at <= int(match[1])][-1]] += 1
    return dict(counts)


def trace(mode: str, operations: dict[str, dict[int, int]]) -> list[list[int]]:
    """For each control period of three rounds of the schedule: see step_tracer.Counter."""
    onset_us = 900_000
    commands = [
        [50_000, "HELLO", 1, 0],
        [450_000, "SET_TELEMETRY", 43],
        [500_000, "SET_POINT", *_SET_POINTS[mode]],
        [520_000, "ENABLE", 0, 0, 0],
    ]
    case = {
        "setup": setup(SUPPLY, []),
        "commands": commands,
        "onset_us": onset_us,
        "end_us": onset_us + 3 * _ROUND * PERIOD_us,
    }
    order = {
        "paths": [str(folder) for folder in (ON_BOARD, BOARD_SIDE, find_firmware())],
        "firmware": str(find_firmware()),
        "operations": operations,
        "case": case,
    }
    tracer = Path(__file__).with_name("step_tracer.py")
    done = subprocess.run(
        [sys.executable, "-B", str(tracer)],
        input=json.dumps(order),
        capture_output=True,
        text=True,
        check=False,
    )
    if done.returncode:
        raise RuntimeError(done.stderr)
    found: dict[str, Any] = json.loads(done.stdout)
    if found["left"] or found["refused"]:
        raise RuntimeError(f"the firmware did not run through: {found['left']} {found['refused']}")
    return found["periods"]


def budget(mode: str, operations: dict[str, dict[int, int]]) -> dict[str, float]:
    """Means and largest values over the control periods, and what follows from them."""
    columns = list(zip(*trace(mode, operations), strict=True))
    step, rest, step_calls, rest_calls, transactions, bits = columns
    all_us = [(a + b) * US_PER_OPERATION for a, b in zip(step, rest, strict=True)]
    bus_us = fmean(bits) / 0.4
    return {
        "transactions": fmean(transactions),
        "most transactions": max(transactions),
        "bits": fmean(bits),
        "most bits": max(bits),
        "bus at 400 kHz, us": bus_us,
        "bus at 1 MHz, us": fmean(bits),
        "operations in the step": fmean(step),
        "most in a step": max(step),
        "operations around it": fmean(rest),
        "most around it": max(rest),
        "calls in the step": fmean(step_calls),
        "calls around it": fmean(rest_calls),
        "shortest period by work, us": bus_us + fmean(all_us),
        "longest turn, us": max(bits) / 0.4 + max(all_us),
        # From the order to convert until the next look: the period, less reading flag and result and giving the order.
        "shortest period by the converter, us": CONVERSION_us + max(bits) / 0.4,
    }


def main() -> None:
    if find_interpreter().name != "MicroPython":
        print("  MicroPython's byte code can only be listed where its package is installed")
        return
    operations = operations_by_line()
    budgets = {mode: budget(mode, operations) for mode in _SET_POINTS}
    print(f"  {'':40s}" + "".join(f"{mode:>12s}" for mode in budgets))
    for name in next(iter(budgets.values())):
        print(f"  {name:40s}" + "".join(f"{found[name]:12.1f}" for found in budgets.values()))
    shortest = max(
        max(found["shortest period by work, us"], found["shortest period by the converter, us"])
        for found in budgets.values()
    )
    print(
        f"  at {US_PER_OPERATION} us an operation (an estimate): {shortest:.0f} us, {1e6 / shortest:.0f} steps/s;"
    )
    print(f"  the shipped period is {PERIOD_us} us: {1e6 / PERIOD_us:.1f} steps/s with one conversion each")


if __name__ == "__main__":
    main()
