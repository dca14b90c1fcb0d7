"""Makes a record whole whose program was gone before its run was over: all of it in one transaction, or nothing.

The samples stay as they are; the board's log, the result of the test it belongs to and the whole result join them.
It must not know devices or procedures, nor work out a result.
"""

from __future__ import annotations

import json
import sqlite3
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

from sinkwright.errors import RecordError
from sinkwright.records.board_log import LoggedEntry
from sinkwright.records.header import iso_utc
from sinkwright.records.reader import open_record
from sinkwright.records.schema import (
    BOARD_LOG,
    INSERT_EVENT,
    INSERT_LOGGED,
    READABLE_VERSIONS,
    SCHEMA_VERSION,
)
from sinkwright.results import RunResult

_SET_RUN = "INSERT OR REPLACE INTO run VALUES (?, ?)"


@dataclass(frozen=True)
class Missing:
    """What a record lacks. `test` is the number of the run's test, whose result is the last of `result`."""

    entries: Sequence[LoggedEntry]
    test: int
    result: RunResult
    state: str
    ended_us: int
    words: str


def merge(path: Path, missing: Missing) -> None:
    """Put it into the record. Raises RecordError for a file that is none, or cannot be written."""
    with open_record(path) as record:
        version = record.version
        ended = record.utc_of(missing.ended_us)
    utc = iso_utc(ended) if ended else ""
    event = (missing.ended_us, utc, "resumed", missing.words, json.dumps({"entries": len(missing.entries)}))
    connection = sqlite3.connect(path, isolation_level=None)
    try:
        connection.execute("BEGIN IMMEDIATE")
        if version in READABLE_VERSIONS and version < SCHEMA_VERSION:
            _bring_up_to_date(connection)
        connection.executemany(INSERT_LOGGED, missing.entries)
        _put_results(connection, missing)
        connection.execute(INSERT_EVENT, event)
        connection.executemany(_SET_RUN, [("state", missing.state), ("ended_utc", utc)])
        connection.execute("COMMIT")
        # The program that was killed left a write-ahead log beside the file: now there is one file again.
        connection.execute("PRAGMA wal_checkpoint(TRUNCATE)")
        connection.execute("PRAGMA journal_mode=DELETE")
    except sqlite3.Error as error:
        raise RecordError(
            f"the record cannot be finished ({error})",
            where=str(path),
            load="The run is over, and the board still keeps its log.",
            remedy="Make room or close whatever else has the file open, and run `sinkwright resume` again.",
        ) from error
    finally:
        connection.close()


def _bring_up_to_date(connection: sqlite3.Connection) -> None:
    connection.execute(BOARD_LOG.create_sql)
    connection.execute(f"PRAGMA user_version={SCHEMA_VERSION}")
    connection.execute(_SET_RUN, ("schema_version", str(SCHEMA_VERSION)))


def _put_results(connection: sqlite3.Connection, missing: Missing) -> None:
    result = missing.result.tests[-1]
    connection.execute(
        "INSERT OR REPLACE INTO result VALUES (?, ?)", (missing.test, json.dumps(result.to_json()))
    )
    connection.execute(
        "INSERT OR REPLACE INTO run_result VALUES (1, ?)", (json.dumps(missing.result.to_json()),)
    )
