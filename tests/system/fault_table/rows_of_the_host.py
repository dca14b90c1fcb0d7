"""The rows whose fault lies with the host, the clock or the firmware's own time."""

from __future__ import annotations

from .rows import Row, restarted

#: 3 s of silence, counted from the last beat, which may be half a second old.
_SILENCE = 1279

ROWS = (
    Row("host killed", "Host killed", ("HOST_SILENT",), _SILENCE, trouble={"kind": "host_killed"}, phases=2),
    Row(
        "garbage",
        "Garbage on the line at full rate",
        ("HOST_SILENT",),
        _SILENCE,
        trouble={"kind": "garbage"},
        phases=2,
    ),
    Row(
        "unread",
        "Host keeps the port open and reads nothing",
        ("HOST_SILENT",),
        _SILENCE,
        trouble={"kind": "unread"},
        phases=2,
    ),
    Row(
        "clock wraps",
        "Clock wraps at 2^30, and the host is killed with it",
        ("HOST_SILENT",),
        _SILENCE,
        trouble={"kind": "host_killed"},
        phases=2,
        wraps=True,
    ),
    Row("watchdog", "Firmware hangs under load", (restarted(2),), 893, trouble={"kind": "hung"}, phases=2),
    Row(
        "loop starved",
        "Loop starved by 100 ms",
        ("LOOP_LATE",),
        44,
        trouble={"kind": "starved", "us": 100_000},
    ),
)
