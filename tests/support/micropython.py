"""Runs a script under the real MicroPython interpreter, with the shipped firmware folder importable.

It decides how the interpreter is found and started, and that an uncaught exception in the script fails the
test. It knows nothing of what the scripts check.
"""

from __future__ import annotations

import os
import subprocess
import sys
import tempfile
from collections.abc import Iterable
from pathlib import Path

FIRMWARE = Path(__file__).resolve().parents[2] / "firmware"

# The package's own console script drops the interpreter's exit status, so a failed script would look like a
# good one.
_LAUNCHER = "import sys, micropython_unix; sys.exit(micropython_unix.run_main(sys.argv))"


class MicroPythonFailed(AssertionError):
    """The script raised, or left with another exit status than 0; the text is what it printed."""


def micropython_command(*arguments: str) -> list[str]:
    """The command line that starts the interpreter with `arguments`, its exit status passed on."""
    return [sys.executable, "-c", _LAUNCHER, *arguments]


def run_micropython(
    script_text: str,
    *,
    heapsize: str | None = None,
    extra_path: Iterable[str | Path] = (),
    timeout_s: float = 60.0,
    stdin: bytes = b"",
) -> str:
    """Run `script_text` and return what it printed.

    `heapsize` is the interpreter's own notation ("256k"). `extra_path` comes before the firmware folder on
    sys.path, as the simulated board's folder does. Raises MicroPythonFailed when the script raises.
    """
    with tempfile.TemporaryDirectory() as folder:
        script = Path(folder, "script.py")
        script.write_text(script_text, encoding="utf-8")
        options = ["-X", f"heapsize={heapsize}"] if heapsize else []
        search = [str(path) for path in (*extra_path, FIRMWARE)] + [".frozen"]
        finished = subprocess.run(
            micropython_command(*options, str(script)),
            env={**os.environ, "MICROPYPATH": os.pathsep.join(search)},
            input=stdin,
            capture_output=True,
            timeout=timeout_s,
            check=False,
        )
    printed = finished.stdout.decode("utf-8", "replace")
    if finished.returncode != 0:
        raise MicroPythonFailed(f"{printed}\n{finished.stderr.decode('utf-8', 'replace')}")
    return printed
