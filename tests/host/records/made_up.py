"""Made-up runs for tests of records and reports: a 12.1 V source behind 45 mohm, measured by a board of 0.3
%.

The figures hold together as those of a real run would: V = 12.1 V - 0.045 ohm * I, P = V * I, the heatsink
warms as 1.6 K/W with 180 s. No device code is involved.
"""

from __future__ import annotations

import math
from collections.abc import Iterator
from datetime import UTC, datetime
from pathlib import Path

from sinkwright.records import Anchor, RecordHeader, RecordWriter
from sinkwright.results import Contribution, Quantity, RunResult, TestResult
from sinkwright.sample import Sample

OPEN_V, INNER_ohm = 12.1, 0.045
INTERVAL_us = 100_000
BOOT_us = 5_000_000
STARTED = datetime(2026, 3, 14, 9, 26, 53, tzinfo=UTC)

PLAN = """\
[source]
name = "bench supply no. 7"
rated_voltage_V = 12.0
rated_current_A = 2.0

[[test]]
kind = "load-regulation"
accept.load_regulation_percent = { max = 1.0 }
accept.no_load_voltage_V = { min = 11.8, max = 12.2 }

[[test]]
kind = "hold"
current_A = 2.0
duration_s = 60.0
"""

BOARD = {
    "name": "perfboard-4A",
    "board_id": "a1b2c3d4e5f60718",
    "firmware_version": "0.1.0",
    "interpreter": "MicroPython 1.28.0 unix",
    "simulated": True,
    "control_period_s": 0.00235,
    "boot_number": 77,
    "board_file_crc": 0x1234ABCD,
    "calibration_number": 0,
}


def header(**changes: object) -> RecordHeader:
    facts: dict = {
        "plan_name": "after-repair",
        "plan_text": PLAN,
        "board": BOARD,
        "board_file": 'name = "perfboard-4A"\n',
        "simulated": True,
        "url": "sim:,seed=1",
        "item": "bench supply no. 7",
        "operator": "A. Tester",
        "started_utc": "2026-03-14T09:26:53.000000Z",
        "anchor": Anchor(BOOT_us, STARTED),
    }
    return RecordHeader(**{**facts, **changes})


def samples(currents_A: list[float], first: int = 1) -> Iterator[Sample]:
    """One frame for each current, ten a second; the heatsink's temperature follows the power."""
    rise_K, charge_C, energy_J = 0.0, 0.0, 0.0
    share = 1 - math.exp(-INTERVAL_us / 1e6 / 180)
    for number, current_A in enumerate(currents_A, start=first):
        voltage_V = OPEN_V - INNER_ohm * current_A + 0.0004 * math.sin(number * 1.7)
        rise_K += (1.6 * voltage_V * current_A - rise_K) * share
        charge_C += current_A * INTERVAL_us / 1e6
        energy_J += current_A * voltage_V * INTERVAL_us / 1e6
        yield Sample(
            number=number,
            time_us=BOOT_us + (number - first) * INTERVAL_us,
            state=1 if current_A else 0,
            mode=1,
            limiting=0,
            fault=0,
            setpoint=round(current_A * 1e6),
            voltage_uV=round(voltage_V * 1e6),
            voltage_min_uV=round((voltage_V - 0.0015) * 1e6),
            voltage_max_uV=round((voltage_V + 0.0015) * 1e6),
            current_uA=round(current_A * 1e6),
            current_min_uA=round((current_A - 0.0008) * 1e6),
            current_max_uA=round((current_A + 0.0008) * 1e6),
            force_uV=round((voltage_V - 0.05 * current_A) * 1e6),
            heatsink_mC=round((24 + rise_K) * 1e3),
            junction_mC=round((24 + rise_K + 1.0 * voltage_V * current_A) * 1e3),
            charge_uC=round(charge_C * 1e6),
            energy_uJ=round(energy_J * 1e6),
            pairs=21,
            overruns=0,
            dropped=0,
        )


def regulation(seen_percent: float = 0.749) -> TestResult:
    shares = (
        Contribution("voltage gain: divider", 0.021, "Calibrate the board's voltage."),
        Contribution("scatter of the voltage at 2.000 A", 0.004),
        Contribution("converter: integral non-linearity", 0.003),
    )
    quantities = {
        "load_regulation_percent": Quantity(
            "load_regulation_percent", seen_percent, "%", 0.043, 1.97, max=1.0, verdict="pass",
            reason="The whole interval lies below 1 %.", contributions=shares,
        ),
        "no_load_voltage_V": Quantity(
            "no_load_voltage_V", 12.1, "V", 0.12, 1.81, min=11.8, max=12.2, verdict="inconclusive",
            reason="12.2 V lies within the interval.",
            remedy="Calibrate the board's voltage: its divider's tolerance is the largest part of the doubt.",
            contributions=(Contribution("voltage gain: divider", 0.062, "Calibrate the board's voltage."),),
        ),
        "full_load_voltage_V": Quantity("full_load_voltage_V", 12.01, "V", 0.12, 1.81),
        "output_resistance_ohm": Quantity("output_resistance_ohm", 0.045, "Ω", 0.0026, 1.97),
    }  # fmt: skip
    points = tuple(
        {"current_A": i, "voltage_V": OPEN_V - INNER_ohm * i, "heatsink_degC": 25.0, "time_s": 6.0}
        for i in (0.0, 0.5, 1.0, 1.5, 2.0)
    )
    return TestResult(
        "load-regulation", "inconclusive", quantities,
        notes=("Load regulation is stated as a percentage of the full-load voltage.",),
        not_tested=("Recovery after a load step, and ripple: this load reads means over milliseconds.",),
        started_us=BOOT_us, ended_us=BOOT_us + 9_900_000, points=points,
    )  # fmt: skip


def hold() -> TestResult:
    quantities = {
        "voltage_V": Quantity("voltage_V", 12.01, "V", 0.12, 1.81),
        "current_A": Quantity("current_A", 2.0, "A", 0.025, 1.73),
    }
    return TestResult(
        "hold", "none", quantities, stopped_by="duration_s", notes=("Ended by duration_s after 60.0 s.",),
        started_us=BOOT_us + 10_000_000, ended_us=BOOT_us + 69_900_000,
    )  # fmt: skip


def write_run(path: Path, *, state: str = "complete", seen_percent: float = 0.749, **changes: object) -> Path:
    """A whole run: load regulation for ten seconds, then 2 A for a minute. `open` leaves it unfinished."""
    first, second = regulation(seen_percent), hold()
    levels = [level for level in (0.0, 0.5, 1.0, 1.5, 2.0) for _ in range(20)]
    frames = list(samples(levels + [2.0] * 600))
    writer = RecordWriter.create(path, header(**changes))
    writer.add_event(0, "doing", "The board answers.")
    writer.add_samples(frames[:100])
    writer.add_result(first)
    writer.add_event(BOOT_us + 10_000_000, "doing", "The load sinks 2.000 A.", {"current_A": 2.0})
    writer.add_samples(frames[100:])
    writer.add_result(second)
    if state == "open":
        writer.close()
    else:
        writer.finish(state, RunResult("after-repair", str(path), True, (first, second)))
    return path
