"""Where the firmware that belongs to this host lies, and which of its files go onto a board.

A wheel carries the firmware as package data; a checkout has it in a folder beside `host/`. This is the only
place that knows the two. Nothing here reads, changes or runs the files.
"""

from __future__ import annotations

from pathlib import Path

from sinkwright.errors import SinkwrightError

_PACKAGE = Path(__file__).resolve().parent
ENTRY = "main.py"


def find_firmware(package: Path = _PACKAGE) -> Path:
    """The folder whose content is copied to a board as it stands: package data, else the checkout's.

    `package` is the folder of the `sinkwright` package. Raises SinkwrightError when neither place has a
    firmware.
    """
    places = (package / "_firmware", package.parents[1] / "firmware")
    for place in places:
        if (place / ENTRY).is_file():
            return place
    raise SinkwrightError(
        f"the firmware is missing: no {ENTRY} in {places[0]} or {places[1]}",
        remedy="Install sinkwright again: its package carries the firmware.",
    )


def deployed_files(firmware: Path) -> tuple[Path, ...]:
    """The files that go onto a board, relative to `firmware`, in a fixed order.

    Byte code that CPython leaves behind when it runs these files (`__pycache__`) and hidden files stay
    here: a board would take memory for them and never use them.
    """
    found = (path.relative_to(firmware) for path in firmware.rglob("*") if path.is_file())
    return tuple(sorted(path for path in found if not any(_stays_here(part) for part in path.parts)))


def _stays_here(part: str) -> bool:
    return part == "__pycache__" or part.startswith(".")
