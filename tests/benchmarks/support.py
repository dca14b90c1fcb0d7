"""What more than one benchmark needs: a record to write into."""

from __future__ import annotations

from pathlib import Path

from sinkwright.records.header import RecordHeader
from sinkwright.records.writer import RecordWriter


def record_writer(folder: Path) -> RecordWriter:
    """A record of an invented run, being written in `folder`."""
    header = RecordHeader(
        plan_name="benchmark",
        plan_text="",
        board={"name": "benchmark"},
        board_file="",
        simulated=True,
        url="sim:",
    )
    return RecordWriter.create_in(folder, header)
