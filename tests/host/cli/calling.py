"""Calls `sinkwright` as a person does, and keeps small plans for it."""

from __future__ import annotations

import io
import json
import os
import subprocess
import sys
from contextlib import redirect_stderr, redirect_stdout
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from sinkwright.cli import invoke

PLAN = """
[source]
name = "an invented supply"
rated_voltage_V = 12.0
rated_current_A = 2.0

[[test]]
kind = "hold"
current_A = 1.0
duration_s = 3.0
"""


def write_plan(folder: Path, accept: str = "", text: str = PLAN) -> Path:
    """A plan that holds 1 A for 3 s on the demo's supply, with bounds."""
    path = folder / "small-plan.toml"
    path.write_text(text + accept)
    return path


def command(*arguments: str | Path) -> list[str]:
    return [sys.executable, "-m", "sinkwright", *map(str, arguments)]


def environment(**more: str) -> dict[str, str]:
    return {**os.environ, "PYTHONPATH": os.pathsep.join(sys.path), **more}


@dataclass(frozen=True)
class Done:
    """What a command left behind."""

    returncode: int
    stdout: str
    stderr: str


def call_here(*arguments: str | Path) -> Done:
    """Run one command in this process, which saves loading the drawing of figures again each time."""
    with redirect_stdout(io.StringIO()) as out, redirect_stderr(io.StringIO()) as told:
        code = invoke([str(argument) for argument in arguments])
    return Done(code, out.getvalue(), told.getvalue())


def call(*arguments: str | Path, **more: str) -> Done:
    """Run one command to its end, in a process of its own; `more` goes into its environment."""
    done = subprocess.run(
        command(*arguments),
        capture_output=True,
        text=True,
        env=environment(**more),
        timeout=120,
        stdin=subprocess.DEVNULL,
        check=False,
    )
    return Done(done.returncode, done.stdout, done.stderr)


def run_plan(plan: Path, out: Path, *options: str) -> Done:
    """`run` on the demo's supply, faster than real time."""
    return call_here("run", plan, "--port", "sim:,speed=max", "--out", out, *options)


def printed_json(done: Done) -> Any:
    """The one object on stdout; fails when there is anything else."""
    return json.loads(done.stdout)


def assert_one_paragraph(done: Done) -> None:
    """What a person sees of an error: text in one piece, no traceback."""
    told = done.stderr.strip()
    assert told
    assert "Traceback" not in told
    assert len(told.splitlines()) == 1, told
