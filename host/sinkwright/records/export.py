"""Samples of a record as CSV or Parquet, in SI units, each row with its UTC time and whether it was
simulated.

Text goes out so that no spreadsheet takes it for a formula. The file appears whole or not at all.
"""

from __future__ import annotations

import csv
import io
from collections.abc import Callable, Iterator
from itertools import islice
from pathlib import Path
from typing import Any, NamedTuple

from sinkwright.errors import RecordError
from sinkwright.records.header import iso_utc
from sinkwright.records.outfile import written_whole
from sinkwright.records.reader import Record
from sinkwright.sample import FIELD_NAMES, LIMITING_NAMES, MODE_NAMES, SETPOINT_PARTS, STATE_NAMES

_CHUNK_ROWS = 10_000
_MODE = FIELD_NAMES.index("mode")
_SETPOINT_UNITS = {0: "", 1: "A", 2: "W", 3: "ohm", 4: "V"}
#: A cell that begins so is calculated by spreadsheets when the file is opened (OWASP, "CSV Injection").
_FORMULA_STARTS = ("=", "+", "-", "@", "\t", "\r")

#: Told the number of samples written so far.
Tell = Callable[[int], None]


class _Column(NamedTuple):
    name: str
    field: str
    parts: int


#: Numbers in SI units, and the raw field and divisor that each comes from.
_NUMBERS = (
    _Column("voltage_V", "voltage_uV", 1_000_000),
    _Column("voltage_min_V", "voltage_min_uV", 1_000_000),
    _Column("voltage_max_V", "voltage_max_uV", 1_000_000),
    _Column("current_A", "current_uA", 1_000_000),
    _Column("current_min_A", "current_min_uA", 1_000_000),
    _Column("current_max_A", "current_max_uA", 1_000_000),
    _Column("force_V", "force_uV", 1_000_000),
    _Column("heatsink_degC", "heatsink_mC", 1_000),
    _Column("junction_degC", "junction_mC", 1_000),
    _Column("charge_C", "charge_uC", 1_000_000),
    _Column("energy_J", "energy_uJ", 1_000_000),
)
_NUMBER_PLACES = tuple((FIELD_NAMES.index(c.field), c.parts) for c in _NUMBERS)
_COUNTS = ("pairs", "overruns", "dropped")
_COUNT_PLACES = tuple(FIELD_NAMES.index(name) for name in _COUNTS)

COLUMNS = (
    "utc", "time_s", "number", "test", "state", "mode", "limiting", "fault_code", "setpoint", "setpoint_unit",
    *(column.name for column in _NUMBERS), *_COUNTS, "item", "simulated",
)  # fmt: skip


def export(record: Record, path: Path, tell: Tell | None = None) -> int:
    """Write `record` as the suffix of `path` says; returns the number of samples. Raises RecordError."""
    writers = {".csv": to_csv, ".parquet": to_parquet}
    if path.suffix.lower() not in writers:
        raise RecordError(
            f"{path.suffix or 'a name without suffix'} is no format to export to",
            where=str(path),
            remedy="Name a file that ends in .csv or .parquet.",
        )
    return writers[path.suffix.lower()](record, path, tell)


def to_csv(record: Record, path: Path, tell: Tell | None = None) -> int:
    """Write all samples as CSV (RFC 4180) with a header line; returns their number. Raises RecordError."""
    with written_whole(path, record.path) as raw, io.TextIOWrapper(raw, "utf-8", newline="") as file:
        out = csv.writer(file)
        out.writerow(COLUMNS)
        count = 0
        for chunk in _chunks(record):
            out.writerows([_csv_row(row) for row in chunk])
            count = _told(tell, count + len(chunk))
    return count


def to_parquet(record: Record, path: Path, tell: Tell | None = None) -> int:
    """Write all samples as Parquet, `utc` as a timestamp; returns their number. Raises RecordError."""
    try:
        import pyarrow
        import pyarrow.parquet
    except ImportError as error:
        raise RecordError(
            "Parquet needs a package that is not installed (pyarrow)",
            where=str(path),
            remedy="Install it with: pip install 'sinkwright[export]' - or export to .csv, which needs none.",
        ) from error
    schema = _parquet_schema(pyarrow).with_metadata(_facts(record))
    count = 0
    with written_whole(path, record.path) as raw, pyarrow.parquet.ParquetWriter(raw, schema) as out:
        for chunk in _chunks(record):
            columns = [pyarrow.array([row[n] for row in chunk], field.type) for n, field in enumerate(schema)]
            out.write_table(pyarrow.table(columns, schema=schema))
            count = _told(tell, count + len(chunk))
    return count


def guarded(text: str) -> str:
    """Text for a spreadsheet's cell, marked as text where it would be taken for a formula."""
    return f"'{text}" if text.startswith(_FORMULA_STARTS) else text


def _chunks(record: Record) -> Iterator[list[tuple[Any, ...]]]:
    rows = _rows(record)
    while chunk := list(islice(rows, _CHUNK_ROWS)):
        yield chunk


def _rows(record: Record) -> Iterator[tuple[Any, ...]]:
    item, simulated = guarded(record.header.item), record.header.simulated
    for _, test, *raw in record.sample_rows():
        number, time_us, state, mode, limiting, fault, setpoint = raw[:7]
        yield (
            record.utc_of(time_us),
            time_us / 1e6,
            number,
            test,
            STATE_NAMES.get(state, str(state)),
            MODE_NAMES.get(mode, str(mode)),
            LIMITING_NAMES.get(limiting, str(limiting)),
            fault,
            setpoint / SETPOINT_PARTS[mode] if mode in SETPOINT_PARTS else None,
            _SETPOINT_UNITS.get(mode, ""),
            *(raw[place] / parts for place, parts in _NUMBER_PLACES),
            *(raw[place] for place in _COUNT_PLACES),
            item,
            simulated,
        )
    yield from _logged_rows(record)


def _logged_rows(record: Record) -> Iterator[tuple[Any, ...]]:
    """The stretch that only the board kept: rows without a number, and empty where its log has nothing."""
    item, simulated = guarded(record.header.item), record.header.simulated
    for entry in record.board_log():
        if not entry.missed:
            continue
        known = entry._asdict()
        yield (
            record.utc_of(entry.time_us),
            entry.time_us / 1e6,
            None,
            entry.test,
            "sinking",
            *(None,) * 5,
            *(known[c.field] / c.parts if c.field in known else None for c in _NUMBERS),
            *(None,) * len(_COUNTS),
            item,
            simulated,
        )


def _csv_row(row: tuple[Any, ...]) -> list[Any]:
    utc, *middle, simulated = row
    return [iso_utc(utc) if utc else "", *middle, "true" if simulated else "false"]


def _parquet_schema(pyarrow: Any) -> Any:
    whole, real, text = pyarrow.int64(), pyarrow.float64(), pyarrow.string()
    types = {
        "utc": pyarrow.timestamp("us", tz="UTC"),
        "simulated": pyarrow.bool_(),
        **dict.fromkeys(("number", "test", "fault_code", *_COUNTS), whole),
        **dict.fromkeys(("state", "mode", "limiting", "setpoint_unit", "item"), text),
    }
    return pyarrow.schema([(name, types.get(name, real)) for name in COLUMNS])


def _facts(record: Record) -> dict[str, str]:
    header = record.header
    return {
        "item": header.item,
        "operator": header.operator,
        "plan": header.plan_name,
        "board": header.board_name,
        "calibration": header.calibration,
        "simulated": "true" if header.simulated else "false",
        "software_version": header.software_version,
    }


def _told(tell: Tell | None, count: int) -> int:
    if tell:
        tell(count)
    return count
