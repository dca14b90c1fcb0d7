"""Which record a command means: a path, or just the name of one in the usual folder."""

from __future__ import annotations

from pathlib import Path


def find_record(given: Path) -> Path:
    """`given`, or the record of that name in ~/sinkwright when there is no such file here."""
    from sinkwright.records.naming import SUFFIX, default_folder

    if given.exists() or given.parent != Path():
        return given
    for name in (given.name, given.name + SUFFIX):
        candidate = default_folder() / name
        if candidate.is_file():
            return candidate
    return given
