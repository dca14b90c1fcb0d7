"""Runs a check under MicroPython against the simulated board's own files, and under CPython too."""

from __future__ import annotations

import os
import subprocess
import sys
from pathlib import Path

from tests.support.micropython import FIRMWARE, run_micropython

BOARD_SIDE = Path(__file__).resolve().parents[3] / "host" / "sinkwright" / "simulator" / "board_side"
HERE = Path(__file__).resolve().parent

_PREFACE = "from nominal_board import World, near, ntc_ohm, plant\nimport math\n"


def check(script: str) -> str:
    """Run `script` (assertions) under MicroPython, with `World`, `plant`, `near`, `ntc_ohm`; return what it
    printed.
    """
    return run_micropython(_PREFACE + script, extra_path=(BOARD_SIDE, HERE))


def check_under_cpython(script: str) -> str:
    """The same under this interpreter, with MicroPython's names supplied as start.py supplies them."""
    start = "import cpython_stand_ins\ncpython_stand_ins.install()\n"
    path = os.pathsep.join(str(folder) for folder in (BOARD_SIDE, HERE, FIRMWARE))
    finished = subprocess.run(
        [sys.executable, "-c", start + _PREFACE + script],
        env={**os.environ, "PYTHONPATH": path},
        capture_output=True,
        text=True,
        check=False,
        timeout=60,
    )
    assert finished.returncode == 0, finished.stderr
    return finished.stdout
