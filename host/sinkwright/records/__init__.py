"""Records of runs: one SQLite file each, written while the run goes on, read by anything."""

from __future__ import annotations

from sinkwright.records.header import UNCALIBRATED, Anchor, RecordHeader
from sinkwright.records.naming import default_folder
from sinkwright.records.reader import Record, RecordedEvent, open_record
from sinkwright.records.writer import RecordWriter

__all__ = [
    "UNCALIBRATED",
    "Anchor",
    "Record",
    "RecordHeader",
    "RecordWriter",
    "RecordedEvent",
    "default_folder",
    "open_record",
]
