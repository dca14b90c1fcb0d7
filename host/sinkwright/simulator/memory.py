"""What one simulated board remembers from one start to the next, in a file of its own (`store=FILE`).

Decides the file's format and that it is always whole: it is written beside, then renamed, here at each
start and by the board itself (board_side/board.py) whenever its firmware writes its store. So whoever is
killed leaves the old file or the new one. A memory belongs to the board that it was made with, because another
seed means other parts.
"""

from __future__ import annotations

import contextlib
import os
from pathlib import Path

import msgspec

from sinkwright.errors import FileError

FORMAT = "sinkwright simulated board memory 2"


class Memory(msgspec.Struct, frozen=True, forbid_unknown_fields=True):
    """`starts` counts the simulated power-ups; `seed` says which board it is; `slots` are the octets of its
    store, in hexadecimal.
    """

    format: str
    seed: int
    starts: int
    slots: tuple[str, str]


def take_out(path: Path, seed: int) -> Memory:
    """The memory of the board number `seed` in `path`, with one more start counted there.

    Raises FileError when the file is something else, another board's, or cannot be written.
    """
    before = _read(path, seed)
    memory = msgspec.structs.replace(before, starts=before.starts + 1)
    _write(path, memory)
    return memory


def _read(path: Path, seed: int) -> Memory:
    try:
        memory = msgspec.json.decode(path.read_bytes(), type=Memory)
    except FileNotFoundError:
        return Memory(FORMAT, seed, 0, ("", ""))
    except OSError as error:
        raise _unusable(path, f"cannot be read: {error.strerror}") from error
    except msgspec.MsgspecError as error:
        raise _unusable(path, f"is not the memory of a simulated board: {error}") from error
    if memory.format != FORMAT or not _are_octets(memory.slots):
        raise _unusable(path, f"is not the memory of a simulated board: its format is not {FORMAT!r}")
    if memory.seed != seed:
        raise FileError(
            f"this is the memory of the simulated board with seed {memory.seed}, "
            f"whose parts differ from those of seed {seed}",
            where=str(path),
            remedy=f"Use seed={memory.seed} with it, or another file.",
        )
    return memory


def _are_octets(slots: tuple[str, str]) -> bool:
    try:
        return all(bytes.fromhex(slot) is not None for slot in slots)
    except ValueError:
        return False


def _write(path: Path, memory: Memory) -> None:
    beside = path.with_name(f"{path.name}.{os.getpid()}.new")
    try:
        with beside.open("xb") as file:
            file.write(msgspec.json.format(msgspec.json.encode(memory)) + b"\n")
            file.flush()
            os.fsync(file.fileno())
        beside.replace(path)
    except OSError as error:
        with contextlib.suppress(OSError):
            beside.unlink()
        raise _unusable(path, f"cannot be written: {error.strerror}") from error


def _unusable(path: Path, what: str) -> FileError:
    return FileError(
        f"the file {what}",
        where=str(path),
        remedy="Name a file that does not exist yet, or one that a simulated board has written.",
    )
