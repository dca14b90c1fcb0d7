"""Runs cases on the board's side: bench.py in the simulated board's own interpreter, several cases a child.

Decides how a case becomes the bench's JSON and how its findings come back. What a finding is worth is decided in
rows.py and judging.py.
"""

from __future__ import annotations

import json
import os
import subprocess
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from sinkwright.board_image import compile_board
from sinkwright.definitions.loading import load_board, parse_source
from sinkwright.firmware_files import find_firmware
from sinkwright.simulator import launcher
from sinkwright.simulator.draws import draw_board_id, draw_plant, source_keys
from sinkwright.simulator.interpreter import Interpreter, find_interpreter

ON_BOARD = Path(__file__).parent / "on_board"
BOARD_SIDE = Path(launcher.__file__).parent / "board_side"
_SEED = 1
# Small enough for a processor's cache: with ten times as much, a case takes three times as long.
_HEAP_BYTES = 3 << 19
_TIMEOUT_s = 900.0
_FILE = load_board(None)
_BOARD = {
    "image": compile_board(_FILE),
    "seed": _SEED,
    "boot_number": 1,
    "board_id": draw_board_id(_SEED).hex(),
}


@dataclass(frozen=True)
class Case:
    """One run of the firmware. Times are the board's, from its power-up."""

    source: str
    commands: list[list[Any]]
    onset_us: int
    end_us: int
    defects: list[dict[str, Any]]
    trouble: dict[str, Any]
    #: Where the board's tick counter stands at power-up.
    first_ticks: int = 0
    #: How often the bench looks: a slow process needs no look in every control period.
    periods_a_grant: int = 1


def setup(source: str, defects: list[dict[str, Any]]) -> dict[str, Any]:
    """What the simulated board is told: the shipped board file, with the parts that seed 1 draws."""
    return _BOARD | {
        "source": source_keys(parse_source(source)),
        "plant": draw_plant(_FILE, _SEED) | {"defects": defects},
    }


def run_cases(cases: list[Case]) -> list[dict[str, Any]]:
    """The findings of every case, in order; two children share them."""
    lines = [json.dumps(_entry(case)) for case in cases]
    halves = [lines[0::2], lines[1::2]]
    with ThreadPoolExecutor(2) as pool:
        found = list(pool.map(_run_lines, halves))
    return [found[number % 2][number // 2] for number in range(len(lines))]


def run_script(name: str, *arguments: str, heap_bytes: int = _HEAP_BYTES, native: bool | None = None) -> str:
    """Run one file of the board's side with arguments; what it printed."""
    return _run(name, arguments, "", find_interpreter(heap_bytes, native=native))


def _entry(case: Case) -> dict[str, Any]:
    return {
        "setup": setup(case.source, case.defects) | {"first_ticks": case.first_ticks},
        "commands": case.commands,
        "onset_us": case.onset_us,
        "end_us": case.end_us,
        "trouble": case.trouble,
        "periods_a_grant": case.periods_a_grant,
    }


def _run_lines(lines: list[str]) -> list[dict[str, Any]]:
    if not lines:
        return []
    printed = _run("bench.py", (), "\n".join(lines) + "\n", find_interpreter(_HEAP_BYTES))
    return [json.loads(line) for line in printed.splitlines()]


def _run(name: str, arguments: tuple[str, ...], text: str, interpreter: Interpreter) -> str:
    path = os.pathsep.join(str(folder) for folder in (ON_BOARD, BOARD_SIDE, find_firmware()))
    # By its path as an option of the child's own, because a child does not take over the caller's environment.
    command = interpreter.run(ON_BOARD / "begin.py", path, name, *arguments)
    done = subprocess.run(
        command, input=text, capture_output=True, text=True, check=False, timeout=_TIMEOUT_s, encoding="utf-8"
    )
    if done.returncode != 0:
        raise AssertionError(
            f"the bench itself failed ({done.returncode}):\n{done.stderr}\n{done.stdout[-500:]}"
        )
    return done.stdout
