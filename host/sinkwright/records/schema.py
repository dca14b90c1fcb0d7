"""The tables of a record: their columns, what each means, and the SQL that makes them.

One declaration serves the writer, the reader and the documentation (host/docs/records.md, by `document.py`).
It opens no file. A change of any table raises SCHEMA_VERSION.
"""

from __future__ import annotations

from dataclasses import dataclass

from sinkwright.sample import FIELD_NAMES

#: Version 2 added `board_log`.
SCHEMA_VERSION = 2
READABLE_VERSIONS = (1, 2)

#: SQLite's application_id of our records: "Sink" in ASCII. Another program's database has another number, or
#: 0.
APPLICATION_ID = 0x53696E6B

#: How a run stands or ended. `open`: still being written, or its program was killed.
STATES = {
    "open": "being written, or never finished",
    "complete": "every test of the plan was carried out",
    "interrupted": "stopped by the person",
    "fault": "stopped by a protection of the board",
    "lost": "the link to the board was lost",
    "failed": "stopped by an error of another kind",
}


@dataclass(frozen=True)
class Column:
    """One column: `sql` is its type and constraint, `meaning` its line in the documentation."""

    name: str
    sql: str
    meaning: str


@dataclass(frozen=True)
class Table:
    """One table and what it holds."""

    name: str
    meaning: str
    columns: tuple[Column, ...]

    @property
    def create_sql(self) -> str:
        columns = ",\n  ".join(f"{column.name} {column.sql}" for column in self.columns)
        return f"CREATE TABLE {self.name} (\n  {columns}\n)"


#: Keys of the `run` table. All values are text.
RUN_KEYS = {
    "schema_version": "Version of these tables, also in `PRAGMA user_version`.",
    "state": "How the run stands or ended: " + "; ".join(f"`{s}`: {m}" for s, m in STATES.items()) + ".",
    "plan_name": "Name of the plan (the stem of its file).",
    "plan_text": "The plan's file as it was read.",
    "item": "Label of what was tested; empty if none was given.",
    "operator": "Who ran the plan; empty if nobody was named.",
    "board": "JSON object: what the board said of itself (`name`, `board_id`, `firmware_version`, ...).",
    "board_file": "The board file as it was read.",
    "calibration": "Calibration in force, in words.",
    "software_version": "Version of this program.",
    "simulated": "`true` if any of it was simulated, else `false`.",
    "url": "Port URL of the board.",
    "started_utc": "When the record was opened, ISO 8601, UTC by the computer's clock.",
    "ended_utc": "When the record was closed, likewise; missing while `state` is `open`.",
    "anchor_time_us": "A moment on the board's clock ...",
    "anchor_utc": "... and the same moment in UTC by the computer's clock. Both are missing before the first "
    "sample.",
}

_SAMPLE_MEANINGS = {
    "number": "The board's own number of the frame. A number that is left out is a frame that never arrived.",
    "time_us": "The board's clock, microseconds.",
    "state": "0 off, 1 sinking, 2 ended, 3 fault.",
    "mode": "0 none, 1 constant current, 2 power, 3 resistance, 4 voltage.",
    "limiting": "0 nothing, 1 the source, 2 a ramp, 3 derated by temperature, 4 no source, 5 saturated, "
    "6 unreachable, 7 unresolved, 8 unsettled.",
    "fault": "Code of the latched fault, 0 for none (protocol reference, Fault).",
    "setpoint": "Set-point in the mode's own unit: uA, uW, milliohm, uV.",
    "voltage_uV": "Mean voltage over the frame, microvolt.",
    "voltage_min_uV": "Lowest single reading of the voltage within the frame.",
    "voltage_max_uV": "Highest single reading.",
    "current_uA": "Mean current over the frame, microampere.",
    "current_min_uA": "Lowest single reading of the current within the frame.",
    "current_max_uA": "Highest single reading.",
    "force_uV": "Voltage at the terminals that carry the current.",
    "heatsink_mC": "Heatsink, thousandths of a degree Celsius.",
    "junction_mC": "Transistor junction as the board estimates it.",
    "charge_uC": "Charge since the start of the run, microcoulomb.",
    "energy_uJ": "Energy since the start of the run, microjoule.",
    "pairs": "Voltage-current pairs that the means are made of.",
    "overruns": "Control steps that came late, since boot.",
    "dropped": "Frames that the board had no room to send, since boot.",
}

TABLES = (
    Table(
        "run",
        "What was run: one row per key.",
        (
            Column("key", "TEXT PRIMARY KEY", "See the keys below."),
            Column("value", "TEXT NOT NULL", "Text."),
        ),
    ),
    Table(
        "sample",
        "Telemetry, in the order in which it came; raw integers as the board sent them.",
        (
            Column("row", "INTEGER PRIMARY KEY", "Order of arrival."),
            Column(
                "test",
                "INTEGER NOT NULL",
                "Test of the plan, from 1: one more than the tests concluded by then.",
            ),
            *(Column(name, "INTEGER NOT NULL", _SAMPLE_MEANINGS[name]) for name in FIELD_NAMES),
        ),
    ),
    Table(
        "event",
        "What happened, in words.",
        (
            Column("row", "INTEGER PRIMARY KEY", "Order of arrival."),
            Column(
                "time_us", "INTEGER NOT NULL", "The board's clock, microseconds; 0 before its first frame."
            ),
            Column("utc", "TEXT NOT NULL", "The same in UTC, ISO 8601."),
            Column("kind", "TEXT NOT NULL", "Short name of its kind."),
            Column("text", "TEXT NOT NULL", "The event in a sentence."),
            Column("data", "TEXT NOT NULL", "JSON object with figures, if any."),
        ),
    ),
    Table(
        "result",
        "One row per test that was carried out, also if it was stopped.",
        (
            Column("test", "INTEGER PRIMARY KEY", "Number of the test in the plan, from 1."),
            Column(
                "json", "TEXT NOT NULL", "The result: an element of `tests` in `run --json`, with its points."
            ),
        ),
    ),
    Table(
        "run_result",
        "The whole result, written when the run ends.",
        (
            Column("row", "INTEGER PRIMARY KEY CHECK (row = 1)", "Always 1."),
            Column("json", "TEXT NOT NULL", "What `run --json` prints."),
        ),
    ),
)

BOARD_LOG = Table(
    "board_log",
    "A run's log as the board itself kept it, fetched by `sinkwright resume` after the run went on or ended "
    "without this program. Coarser than the samples; empty in most records. New in version 2.",
    (
        Column("time_us", "INTEGER PRIMARY KEY", "The board's clock, microseconds, at the end of the entry."),
        Column("test", "INTEGER NOT NULL", "Test of the plan, from 1."),
        Column(
            "missed", "INTEGER NOT NULL", "1 where the record has no sample of that time any more, else 0."
        ),
        Column("spacing_us", "INTEGER NOT NULL", "Time between entries, microseconds."),
        Column("voltage_uV", "INTEGER NOT NULL", "Mean voltage over the entry, microvolt."),
        Column(
            "voltage_min_uV", "INTEGER NOT NULL", "Lowest single reading of the voltage within the entry."
        ),
        Column("voltage_max_uV", "INTEGER NOT NULL", "Highest single reading."),
        Column("current_uA", "INTEGER NOT NULL", "Mean current over the entry, microampere."),
        Column("heatsink_mC", "INTEGER NOT NULL", "Heatsink, thousandths of a degree Celsius."),
        Column("charge_uC", "INTEGER NOT NULL", "Charge since the start of the run, microcoulomb."),
    ),
)
TABLES = (*TABLES, BOARD_LOG)

INSERT_LOGGED = "INSERT OR REPLACE INTO board_log VALUES ({})".format(", ".join("?" * len(BOARD_LOG.columns)))
INSERT_SAMPLE = "INSERT INTO sample (test, {}) VALUES ({})".format(
    ", ".join(FIELD_NAMES), ", ".join("?" * (1 + len(FIELD_NAMES)))
)
INSERT_EVENT = "INSERT INTO event (time_us, utc, kind, text, data) VALUES (?, ?, ?, ?, ?)"
