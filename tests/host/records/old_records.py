"""Records as earlier versions wrote them, kept as SQL text in tests/data/records, one a schema version.

Never write one anew: a version of the schema that was released stays readable, or is refused in words.
"""

from __future__ import annotations

import sqlite3
from pathlib import Path

DATA = Path(__file__).parents[2] / "data" / "records"


def restored(version: int, folder: Path) -> Path:
    """The kept record of a schema version, as a file again."""
    path = folder / f"version-{version}.sqlite"
    connection = sqlite3.connect(path, isolation_level=None)
    connection.executescript((DATA / f"version-{version}.sql").read_text(encoding="utf-8"))
    connection.close()
    return path
