"""Opens a record for reading, whole or cut short, finished or still being written, and tells what it holds.

Whatever is no record of ours, or a damaged one, becomes a RecordError with a sentence. Reads in short
transactions, so that a run that is still writing is not held up. It never changes the file.
"""

from __future__ import annotations

import contextlib
import json
import sqlite3
from collections.abc import Iterator
from dataclasses import dataclass
from datetime import UTC, datetime
from pathlib import Path
from typing import Any, Self

from sinkwright.errors import RecordError
from sinkwright.records.board_log import (
    BOARD_RUN,
    BoardRunName,
    FOREVER_us,
    GAP_us,
    LoggedEntry,
    run_named_in,
)
from sinkwright.records.checks import checked
from sinkwright.records.envelope import Bin, Extremes, envelope_of, extremes_of
from sinkwright.records.header import RecordHeader
from sinkwright.records.schema import APPLICATION_ID, READABLE_VERSIONS, SCHEMA_VERSION, STATES
from sinkwright.results import RunResult, TestResult, Verdict, overall
from sinkwright.sample import FIELD_NAMES, Sample

_CHUNK_ROWS = 20_000
_MAGIC = b"SQLite format 3\x00"
_ASK_FOR_ANOTHER = "Name a file that a run of this program wrote; `sinkwright records` lists them."
_COLUMNS = ", ".join(FIELD_NAMES)
_GAPS = (
    "SELECT before, time_us FROM (SELECT time_us, lag(time_us) OVER (ORDER BY row) AS before FROM sample)"
    " WHERE time_us - before > ?"
)

#: What SQLite raises on a damaged file; the last when its own message quotes bytes that are no text.
_UNREADABLE = (sqlite3.Error, UnicodeDecodeError)


@dataclass(frozen=True)
class RecordedEvent:
    """One event; `time_us` is the board's clock, 0 where it was not known yet."""

    time_us: int
    utc: str
    kind: str
    text: str
    data: dict[str, Any]


def open_record(path: str | Path) -> Record:
    """Open the record at `path`. Raises RecordError for anything that is no readable record."""
    path = Path(path)
    _check_file(path)
    connection = _connect(path)
    try:
        return Record(path, connection)
    except BaseException:
        connection.close()
        raise


class Record:
    """An open record. Every method may raise RecordError when the file turns out to be damaged."""

    def __init__(self, path: Path, connection: sqlite3.Connection) -> None:
        self.path = path
        self._connection = connection
        self._check_identity()
        rows: dict[str, Any] = dict(self._query("SELECT key, value FROM run"))
        self.header = self._understand("run", lambda: RecordHeader.from_rows(rows))
        self.state = str(rows.get("state", "open"))
        self.ended_utc: str | None = rows.get("ended_utc")

    def __enter__(self) -> Self:
        return self

    def __exit__(self, *reason: object) -> None:
        self.close()

    def close(self) -> None:
        self._connection.close()

    @property
    def unfinished(self) -> str:
        """A sentence about a run that was not finished, or is still going on; empty for a finished one."""
        if self.state != "open":
            return ""
        return (
            "this run was not finished: it is still going on, or was cut off (its program killed, its disk "
            f"full) after {self.sample_count} samples, which are all here"
        )

    @property
    def state_in_words(self) -> str:
        return STATES.get(self.state, self.state)

    @property
    def sample_count(self) -> int:
        return self._query("SELECT count(*) FROM sample")[0][0]

    def samples(self) -> Iterator[Sample]:
        """All samples in the order in which they came."""
        return (Sample(*row[2:]) for row in self.sample_rows())

    def sample_rows(self) -> Iterator[tuple[int, ...]]:
        """Plain rows: row, test, then the fields of Sample."""
        last = -1
        while True:
            rows = self._query(
                f"SELECT row, test, {_COLUMNS} FROM sample WHERE row > ? ORDER BY row LIMIT {_CHUNK_ROWS}",
                last,
            )
            for row in rows:
                # SQLite keeps whatever type it is given; only integers are samples.
                if set(map(type, row)) != {int}:
                    raise self._damaged(f"sample {row[0]} is not made of integers")
                yield row
            if len(rows) < _CHUNK_ROWS:
                return
            last = rows[-1][0]

    def events(self) -> list[RecordedEvent]:
        rows = self._query("SELECT time_us, utc, kind, text, data FROM event ORDER BY row")
        return self._understand(
            "event", lambda: [RecordedEvent(*row[:4], data=json.loads(row[4])) for row in rows]
        )

    def board_runs(self) -> list[BoardRunName]:
        """The runs on the board that this record is of, in their order."""
        rows = self._query(f"SELECT data FROM event WHERE kind = '{BOARD_RUN}' ORDER BY row")
        return self._understand("event", lambda: [run_named_in(json.loads(row[0])) for row in rows])

    def board_log(self) -> list[LoggedEntry]:
        """What the board itself kept of a stretch without this program; empty for most records."""
        if self.version < 2:
            return []
        rows = self._query(f"SELECT {', '.join(LoggedEntry._fields)} FROM board_log ORDER BY time_us")
        if any(type(value) is not int for row in rows for value in row):
            raise self._damaged("table board_log is not made of integers")
        return [LoggedEntry(*row) for row in rows]

    def gaps(self) -> list[tuple[int, int]]:
        """Stretches without samples, from the last one before to the first one after; the last has no end."""
        rows = self._query(_GAPS, GAP_us)
        last = self._query("SELECT max(time_us) FROM sample")[0][0]
        return [(first, then) for first, then in rows] + [(last or 0, FOREVER_us)]

    def results(self) -> list[TestResult]:
        """Results of the tests that were carried out, in the plan's order."""
        rows = self._query("SELECT json FROM result ORDER BY test")
        return self._understand(
            "result", lambda: [checked(TestResult.from_json(json.loads(row[0]))) for row in rows]
        )

    def run_result(self) -> RunResult | None:
        """The whole result; None when the run ended without one."""
        rows = self._query("SELECT json FROM run_result")
        if not rows:
            return None
        return self._understand("run_result", lambda: RunResult.from_json(json.loads(rows[0][0])))

    @property
    def verdict(self) -> Verdict:
        """Over all tests that were carried out. A run that did not come to its end cannot pass."""
        verdict = overall(tuple(result.verdict for result in self.results()))
        return verdict if self.state == "complete" or verdict == "fail" else "inconclusive"

    def utc_of(self, time_us: int) -> datetime | None:
        """UTC of a moment on the board's clock; None when there is no sample yet."""
        return self.header.anchor.utc_of(time_us).astimezone(UTC) if self.header.anchor else None

    def envelope(self, bins: int) -> list[Bin]:
        """The samples in at most `bins` equal stretches of time, with the extremes in each. None is lost."""
        with self._reading():
            return envelope_of(self._connection, bins)

    def extremes(self) -> Extremes | None:
        """Count, gaps and extremes over the whole record; None when there is no sample."""
        with self._reading():
            return extremes_of(self._connection)

    def _check_identity(self) -> None:
        if self._query("PRAGMA application_id")[0][0] != APPLICATION_ID:
            raise RecordError(
                "is a database of another program", where=str(self.path), remedy=_ASK_FOR_ANOTHER
            )
        version = self._query("PRAGMA user_version")[0][0]
        self.version = int(version)
        if version not in READABLE_VERSIONS:
            raise RecordError(
                f"has record version {version}, and this program reads version {SCHEMA_VERSION}",
                where=str(self.path),
                remedy="Open it with the version of Sinkwright that wrote it, or a newer one.",
            )

    def _query(self, sql: str, *values: int) -> list[Any]:
        with self._reading():
            return self._connection.execute(sql, values).fetchall()

    @contextlib.contextmanager
    def _reading(self) -> Iterator[None]:
        try:
            yield
        except _UNREADABLE as error:
            raise self._damaged(str(error)) from error

    def _understand(self, table: str, make: Any) -> Any:
        try:
            return make()
        except (KeyError, TypeError, ValueError, AttributeError, RecursionError, OverflowError) as error:
            raise self._damaged(f"table {table} does not hold what it should: {error!r}") from error

    def _damaged(self, why: str) -> RecordError:
        return RecordError(
            f"is a damaged record ({why})",
            where=str(self.path),
            remedy="Take a copy of it from elsewhere if there is one; the run has to be repeated otherwise.",
        )


def _check_file(path: Path) -> None:
    """Say in words what SQLite would only call an error code."""
    try:
        if not path.is_file():
            what = "is a folder, not a record" if path.is_dir() else "there is no such record"
            raise RecordError(what, where=str(path), remedy=_ASK_FOR_ANOTHER)
        with path.open("rb") as file:
            start = file.read(100)
    except (OSError, ValueError) as error:
        raise RecordError(f"cannot be read ({error})", where=str(path), remedy=_ASK_FOR_ANOTHER) from error
    if not start.startswith(_MAGIC):
        what = "is empty" if not start else "is not a record: no SQLite database at all"
        raise RecordError(what, where=str(path), remedy=_ASK_FOR_ANOTHER)
    if not _wal_holds_something(path) and path.stat().st_size < _stated_size(start):
        raise RecordError(
            "is cut short: it is smaller than its own header says",
            where=str(path),
            remedy="Copy it again from where it came; if that is cut short too, the run has to be repeated.",
        )


def _stated_size(start: bytes) -> int:
    """Bytes that the database should have (SQLite file format, section 1.3: page size at 16, pages at 28)."""
    page = int.from_bytes(start[16:18], "big")
    return (65536 if page == 1 else page) * int.from_bytes(start[28:32], "big")


def _wal_holds_something(path: Path) -> bool:
    wal = path.with_name(path.name + "-wal")
    return wal.exists() and wal.stat().st_size > 0


def _connect(path: Path) -> sqlite3.Connection:
    uri = path.absolute().as_uri()
    try:
        return _opened(f"{uri}?mode=ro")
    except sqlite3.OperationalError as error:
        # A WAL database in a folder that cannot be written: without a WAL it may be read as it lies.
        if _wal_holds_something(path):
            raise RecordError(
                f"cannot be opened here ({error}), because part of it still lies in the -wal file beside it",
                where=str(path),
                remedy="Copy both files to a folder that can be written, and open it there.",
            ) from error
        try:
            return _opened(f"{uri}?mode=ro&immutable=1")
        except _UNREADABLE as second:
            raise _no_record(path, second) from second
    except _UNREADABLE as error:
        raise _no_record(path, error) from error


def _opened(uri: str) -> sqlite3.Connection:
    connection = sqlite3.connect(uri, uri=True, isolation_level=None)
    try:
        connection.execute("SELECT count(*) FROM sqlite_master").fetchone()
    except BaseException:
        connection.close()
        raise
    return connection


def _no_record(path: Path, error: Exception) -> RecordError:
    return RecordError(
        f"is not a record, or a damaged one ({error})", where=str(path), remedy=_ASK_FOR_ANOTHER
    )
