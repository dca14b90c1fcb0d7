"""What lies in a folder of records: the facts of each in short, and by name the files that are none."""

from __future__ import annotations

from dataclasses import asdict, dataclass
from pathlib import Path
from typing import Any

from sinkwright.errors import RecordError
from sinkwright.records.naming import SUFFIX
from sinkwright.records.reader import Record, open_record


@dataclass(frozen=True)
class Listed:
    """One record of a folder. `samples` are counted, so that an empty record shows."""

    path: str
    started_utc: str
    item: str
    operator: str
    plan: str
    board: str
    verdict: str
    state: str
    simulated: bool
    samples: int

    @classmethod
    def of(cls, record: Record) -> Listed:
        header = record.header
        return cls(
            path=str(record.path),
            started_utc=header.started_utc,
            item=header.item,
            operator=header.operator,
            plan=header.plan_name,
            board=header.board_name,
            verdict=record.verdict,
            state=record.state,
            simulated=header.simulated,
            samples=record.sample_count,
        )

    def to_json(self) -> dict[str, Any]:
        return asdict(self)


def list_records(folder: Path, item: str | None = None) -> tuple[list[Listed], list[RecordError]]:
    """Records of `folder`, oldest first, and an error for each file that is none. Raises RecordError for the
    folder.

    With `item` only records with this label.
    """
    try:
        paths = sorted(path for path in folder.iterdir() if path.suffix == SUFFIX)
    except OSError as error:
        raise RecordError(
            f"cannot be listed ({error.strerror or error})",
            where=str(folder),
            remedy="Name the folder that holds the records; the first `sinkwright run` makes the usual one.",
        ) from error
    listed: list[Listed] = []
    unreadable: list[RecordError] = []
    for path in paths:
        try:
            with open_record(path) as record:
                if item is None or record.header.item == item:
                    listed.append(Listed.of(record))
        except RecordError as error:
            unreadable.append(error)
    return sorted(listed, key=lambda one: one.started_utc), unreadable
