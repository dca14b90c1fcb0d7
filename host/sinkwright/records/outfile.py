"""Writes a file beside its final name and moves it there when whole, so that nobody finds half of one."""

from __future__ import annotations

import contextlib
import os
from collections.abc import Iterator
from pathlib import Path
from typing import BinaryIO

from sinkwright.errors import RecordError


@contextlib.contextmanager
def written_whole(path: Path, *records: Path) -> Iterator[BinaryIO]:
    """A binary file that becomes `path` when the block is left without an error.

    Raises RecordError for what cannot be written, and for a `path` that is one of the `records`.
    """
    if path.exists() and any(path.samefile(record) for record in records if record.exists()):
        raise RecordError(
            "is the record itself, which is never written over",
            where=str(path),
            remedy="Choose another name.",
        )
    part = path.with_name(f".{path.name}.{os.getpid()}.part")
    try:
        path.parent.mkdir(parents=True, exist_ok=True)
        with part.open("wb") as file:
            yield file
        part.replace(path)
    except OSError as error:
        raise RecordError(
            f"cannot be written ({error.strerror or error})",
            where=str(path),
            remedy="Name another file, in a folder that can be written, on a disk with room.",
        ) from error
    finally:
        with contextlib.suppress(OSError):
            part.unlink(missing_ok=True)
