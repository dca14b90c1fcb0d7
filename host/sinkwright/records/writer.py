"""Writes a record while its run goes on: cheap per sample, and safe against being killed at any moment.

Samples are gathered and committed at least twice a second, events and results at once; what is committed
survives the death of this program (SQLite's WAL with synchronous=NORMAL; after a loss of power the last
commits may be missing, the file stays whole). It must not know devices or procedures.
"""

from __future__ import annotations

import contextlib
import json
import sqlite3
import time
from collections.abc import Iterable, Mapping, Sequence
from datetime import UTC, datetime
from operator import attrgetter
from pathlib import Path
from typing import Any, Self

from sinkwright.errors import RecordError
from sinkwright.records.board_log import LoggedEntry
from sinkwright.records.header import Anchor, RecordHeader, anchor_rows, iso_utc, utc_now
from sinkwright.records.naming import cannot_write, reserve_path
from sinkwright.records.schema import (
    APPLICATION_ID,
    INSERT_EVENT,
    INSERT_LOGGED,
    INSERT_SAMPLE,
    SCHEMA_VERSION,
    STATES,
    TABLES,
)
from sinkwright.results import RunResult, TestResult
from sinkwright.sample import FIELD_NAMES

COMMIT_INTERVAL_s = 0.5
COMMIT_ROWS = 2000
_SET_RUN = "INSERT OR REPLACE INTO run VALUES (?, ?)"
_RUN_ENDS = "The run ends here, and a run that ends turns its load off."

_FOLD_PATIENCE_ms = 200
#: Where a row to be inserted has its time: the test comes first.
_TIME = 1 + FIELD_NAMES.index("time_us")

#: SQL and the values for its places.
_Statement = tuple[str, tuple[Any, ...]]

_fields_of = attrgetter(*FIELD_NAMES)


class RecordWriter:
    """One record being written. Every method raises RecordError when the file cannot be written any more.

    That is told once: after it, further samples and events are let go without another error, so that nothing
    hinders the run from turning its load off. `committed` counts the samples that are safe on the file. Any
    thread may call, one at a time.
    """

    def __init__(self, path: Path, connection: sqlite3.Connection, header: RecordHeader) -> None:
        self.path = path
        self.header = header
        self.committed = 0
        self.failed = False
        self._connection = connection
        self._anchor = header.anchor
        self._pending: list[tuple[int, ...]] = []
        self._committed_s = time.monotonic()
        self._results = 0
        self._last_us = header.anchor.time_us if header.anchor else 0

    @classmethod
    def create_in(cls, folder: Path, header: RecordHeader) -> Self:
        """A record under its own name in `folder`, which is made if missing. Raises RecordError."""
        return cls.create(reserve_path(folder, header), header)

    @classmethod
    def create(cls, path: Path, header: RecordHeader) -> Self:
        """A record at `path`, where there must be nothing, or an empty file. Raises RecordError."""
        try:
            path.parent.mkdir(parents=True, exist_ok=True)
            taken = path.exists() and (not path.is_file() or path.stat().st_size > 0)
        except OSError as error:
            raise cannot_write(path, error) from error
        if taken:
            raise RecordError(
                "is there already, and records are never written over",
                where=str(path),
                remedy="Choose another name.",
            )
        try:
            connection = sqlite3.connect(path, isolation_level=None, check_same_thread=False)
            _make_tables(connection, header)
        except sqlite3.Error as error:
            raise RecordError(
                f"a record cannot be written here ({error})",
                where=str(path),
                remedy="Name a folder that can be written, on a disk with room.",
            ) from error
        return cls(path, connection, header)

    def __enter__(self) -> Self:
        return self

    def __exit__(self, *reason: object) -> None:
        self.close()

    def add_samples(self, samples: Iterable[Any]) -> None:
        """Keep samples: any objects with the telemetry's fields. Committed within half a second of more
        coming.
        """
        if self.failed:
            return
        test = self._results + 1
        self._pending += [(test, *_fields_of(sample)) for sample in samples]
        if not self._pending:
            return
        self._last_us = self._pending[-1][_TIME]
        if self._anchor is None:
            self._set_anchor(self._pending[0][_TIME])
        late = time.monotonic() - self._committed_s >= COMMIT_INTERVAL_s
        if late or len(self._pending) >= COMMIT_ROWS:
            self.commit()

    def add_event(self, time_us: int, kind: str, text: str, data: Mapping[str, Any] | None = None) -> None:
        """Keep an event, committed when this returns. `time_us` is the board's clock, 0 if not known yet."""
        utc = utc_now() if self._anchor is None else iso_utc(self._anchor.utc_of(time_us))
        row = (time_us, utc, kind, text, json.dumps(dict(data or {}), default=str))
        self.commit((INSERT_EVENT, row))

    def add_board_log(self, entries: Sequence[LoggedEntry]) -> None:
        """Keep what the board itself kept of a stretch without samples, committed when this returns."""
        self.commit(*((INSERT_LOGGED, tuple(entry)) for entry in entries))

    def add_result(self, result: TestResult) -> None:
        """Keep the result of the next test in the plan's order, committed when this returns."""
        self.commit(("INSERT INTO result VALUES (?, ?)", (self._results + 1, json.dumps(result.to_json()))))
        self._results += 1

    def commit(self, *statements: _Statement) -> None:
        """Put what is pending, and the statements after it, on the file as one transaction."""
        if self.failed:
            return
        try:
            self._connection.execute("BEGIN IMMEDIATE")
            self._connection.executemany(INSERT_SAMPLE, self._pending)
            for sql, values in statements:
                self._connection.execute(sql, values)
            self._connection.execute("COMMIT")
        except sqlite3.Error as error:
            raise self._fail(error) from error
        self.committed += len(self._pending)
        self._pending.clear()
        self._committed_s = time.monotonic()

    def finish(self, state: str, run_result: RunResult | None = None) -> Path:
        """Close the record as `state` (a key of STATES); a single file remains, whose path is returned.

        A record that could not be written to its end is closed as far as possible, without another error.
        """
        if state not in STATES:
            raise ValueError(f"{state!r} is no state of a record")
        rows: list[_Statement] = [(_SET_RUN, ("state", state)), (_SET_RUN, ("ended_utc", self._end_utc()))]
        if run_result is not None:
            rows.append(
                ("INSERT OR REPLACE INTO run_result VALUES (1, ?)", (json.dumps(run_result.to_json()),))
            )
        try:
            if self.failed:
                self._write_what_fits(rows)
            else:
                self.commit(*rows)
        finally:
            self.close()
        return self.path

    def close(self) -> None:
        """Commit what is pending and let go of the file, without saying that the run is finished."""
        try:
            if self._pending:
                self.commit()
        finally:
            self._fold_in()
            self._connection.close()

    def _write_what_fits(self, statements: list[_Statement]) -> None:
        """On a full disk a change in place may still fit where a new row did not."""
        for sql, values in statements:
            with contextlib.suppress(sqlite3.Error):
                self._connection.execute(sql, values)

    def _fold_in(self) -> None:
        """Fold the WAL into the one file. While a reader is at it, an empty WAL file has to stay beside."""
        with contextlib.suppress(sqlite3.Error):
            self._connection.execute(f"PRAGMA busy_timeout={_FOLD_PATIENCE_ms}")
            self._connection.execute("PRAGMA wal_checkpoint(TRUNCATE)")
            self._connection.execute("PRAGMA journal_mode=DELETE")

    def _end_utc(self) -> str:
        """By the board's clock when there is one: simulated time runs faster than the computer's."""
        return iso_utc(self._anchor.utc_of(self._last_us)) if self._anchor else utc_now()

    def _set_anchor(self, time_us: int) -> None:
        self._anchor = Anchor(time_us, datetime.now(UTC))
        self.commit(*((_SET_RUN, row) for row in anchor_rows(self._anchor).items()))

    def _fail(self, error: sqlite3.Error) -> RecordError:
        self.failed = True
        self._pending.clear()
        if self._connection.in_transaction:
            self._connection.execute("ROLLBACK")
        full = "full" in str(error)
        what = (
            "the disk is full, so the record cannot go on"
            if full
            else f"the record cannot be written ({error})"
        )
        remedy = "make room before the next run" if full else "look whether the disk is still there"
        return RecordError(
            what,
            where=str(self.path),
            load=_RUN_ENDS,
            remedy=f"The record keeps the {self.committed} samples up to here and opens as usual; {remedy}.",
        )


def _make_tables(connection: sqlite3.Connection, header: RecordHeader) -> None:
    connection.execute("PRAGMA journal_mode=WAL")
    connection.execute("PRAGMA synchronous=NORMAL")
    connection.execute("BEGIN IMMEDIATE")
    connection.execute(f"PRAGMA application_id={APPLICATION_ID}")
    connection.execute(f"PRAGMA user_version={SCHEMA_VERSION}")
    for table in TABLES:
        connection.execute(table.create_sql)
    rows = {"schema_version": str(SCHEMA_VERSION), "state": "open", **header.to_rows()}
    connection.executemany(_SET_RUN, rows.items())
    connection.execute("COMMIT")
