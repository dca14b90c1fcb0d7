"""What a record says about its run before the first sample: plan, item, operator, board, calibration.

Also the two ways in which a record writes a moment. Plain values; knows neither files nor devices.
"""

from __future__ import annotations

import json
from collections.abc import Mapping
from dataclasses import dataclass, field
from datetime import UTC, datetime, timedelta
from typing import Any

from sinkwright import __version__

UNCALIBRATED = "uncalibrated: parts' tolerances"


def utc_now() -> str:
    """Now in UTC as records write it: ISO 8601 to the microsecond, ending in Z."""
    return iso_utc(datetime.now(UTC))


def iso_utc(moment: datetime) -> str:
    return moment.astimezone(UTC).isoformat(timespec="microseconds").replace("+00:00", "Z")


@dataclass(frozen=True)
class Anchor:
    """One moment on the board's clock and in UTC: all other moments follow from it."""

    time_us: int
    utc: datetime

    def utc_of(self, time_us: int) -> datetime:
        """UTC of a moment on the board's clock, in microseconds. Beyond the calendar it stays at its end."""
        try:
            return self.utc + timedelta(microseconds=time_us - self.time_us)
        except OverflowError:
            return datetime.max.replace(tzinfo=UTC)


@dataclass(frozen=True)
class RecordHeader:
    """Facts that are fixed when a run begins.

    `board` is what the board said of itself, as plain values (`dataclasses.asdict` of its identity will do);
    its `name` becomes part of the record's name. Without an `anchor` the first sample makes one on its
    arrival.
    """

    plan_name: str
    plan_text: str
    board: Mapping[str, Any]
    board_file: str
    simulated: bool
    url: str
    item: str = ""
    operator: str = ""
    calibration: str = UNCALIBRATED
    software_version: str = __version__
    started_utc: str = field(default_factory=utc_now)
    anchor: Anchor | None = None

    @property
    def board_name(self) -> str:
        return str(self.board.get("name", ""))

    @property
    def started(self) -> datetime:
        return datetime.fromisoformat(self.started_utc)

    def to_rows(self) -> dict[str, str]:
        """Keys and values for the `run` table."""
        rows = {
            "plan_name": self.plan_name,
            "plan_text": self.plan_text,
            "item": self.item,
            "operator": self.operator,
            "board": json.dumps(dict(self.board), default=str),
            "board_file": self.board_file,
            "calibration": self.calibration,
            "software_version": self.software_version,
            "simulated": "true" if self.simulated else "false",
            "url": self.url,
            "started_utc": self.started_utc,
        }
        return {**rows, **anchor_rows(self.anchor)}

    @classmethod
    def from_rows(cls, rows: Mapping[str, str]) -> RecordHeader:
        """The header in a `run` table. Raises KeyError, TypeError and ValueError for one that is not ours."""
        board = json.loads(rows["board"])
        if not isinstance(board, dict):
            raise ValueError("board is no JSON object")
        datetime.fromisoformat(rows["started_utc"])
        texts = ("plan_name", "plan_text", "board_file", "url", "item", "operator", "calibration",
                 "software_version", "started_utc")  # fmt: skip
        return cls(
            board=board,
            simulated=rows["simulated"] != "false",
            anchor=_anchor_in(rows),
            **{key: str(rows[key]) for key in texts},
        )


def anchor_rows(anchor: Anchor | None) -> dict[str, str]:
    if anchor is None:
        return {}
    return {"anchor_time_us": str(anchor.time_us), "anchor_utc": iso_utc(anchor.utc)}


def _anchor_in(rows: Mapping[str, str]) -> Anchor | None:
    if "anchor_time_us" not in rows:
        return None
    utc = datetime.fromisoformat(rows["anchor_utc"])
    return Anchor(int(rows["anchor_time_us"]), utc if utc.tzinfo else utc.replace(tzinfo=UTC))
