"""Turns telemetry into points: means over a stretch, each with the uncertainty of its own scatter.

A point remembers what was asked for and what the load said about it, so that a procedure can tell a source
that limits from one that obeys. It decides nothing about verdicts.
"""

from __future__ import annotations

import itertools
from collections.abc import Callable
from dataclasses import dataclass
from typing import TYPE_CHECKING

from sinkwright.uncertainty.parts import Averaged, average
from sinkwright_wire.messages import Limiting

if TYPE_CHECKING:
    from sinkwright.procedures.bench import Bench
    from sinkwright.sample import Sample

#: A single frame this far below its demand shows the source's limit: beyond the set-point tolerance of an
#: uncalibrated board before it trims itself. A point comes after the trim, so less is enough (both ours).
FRAME_SHORTFALL = (0.05, 0.05)
POINT_SHORTFALL = (0.02, 0.010)


@dataclass(frozen=True)
class Point:
    """Means over one stretch. `demand_A` None means that the gate was clamped."""

    demand_A: float | None
    voltage: Averaged
    current: Averaged
    ripple_V: float
    heatsink_degC: float
    limited: bool
    started_us: int
    ended_us: int

    def to_json(self) -> dict[str, float]:
        """The point for the report's curves."""
        return {
            "current_A": self.current.mean,
            "voltage_V": self.voltage.mean,
            "heatsink_degC": self.heatsink_degC,
            "time_s": self.started_us / 1e6,
        }


def is_limited(sample: Sample, demand_A: float | None) -> bool:
    """Whether the source gives less than the load asks for, by one frame."""
    if demand_A is None:
        return False
    if sample.limiting in (Limiting.SOURCE, Limiting.NO_SOURCE, Limiting.SATURATED):
        return True
    return sample.limiting != Limiting.RAMPING and _is_short(sample.current_A, demand_A, FRAME_SHORTFALL)


def _is_short(current_A: float, demand_A: float, shortfall: tuple[float, float]) -> bool:
    share, amperes = shortfall
    return demand_A - current_A > amperes + share * demand_A


def time_mean(values: list[float], label: str) -> Averaged:
    """The mean over a stretch as a quantity of its own: what the source did meanwhile belongs to it.

    So its scatter is that of the readings alone, whatever slow course they take: from the differences of
    neighbours, half their mean square (von Neumann).
    """
    count = len(values)
    mean = sum(values) / count
    if count < 2:
        return Averaged(mean, 0.0, count, label)
    squares = sum((b - a) ** 2 for a, b in itertools.pairwise(values))
    return Averaged(mean, (squares / (2 * (count - 1)) / count) ** 0.5, count, label)


async def gather(bench: Bench, demand_A: float | None, measure_s: float, label: str) -> Point:
    """Average the frames of `measure_s`, at least two; `label` names their scatter as a cause."""
    frames: list[Sample] = []
    end_us = bench.now_us + round(measure_s * 1e6)
    while len(frames) < 2 or frames[-1].time_us < end_us:
        frame = await bench.next_frame()
        if frame.pairs:
            frames.append(frame)
    return point_of(frames, demand_A, label)


def point_of(
    frames: list[Sample],
    demand_A: float | None,
    label: str,
    averaging: Callable[[list[float], str], Averaged] = average,
) -> Point:
    """The means of frames that are already here, with their scatter as `averaging` finds it."""
    current = averaging([f.current_A for f in frames], f"current readings {label}")
    short = demand_A is not None and _is_short(current.mean, demand_A, POINT_SHORTFALL)
    return Point(
        demand_A=demand_A,
        voltage=averaging([f.voltage_V for f in frames], f"voltage readings {label}"),
        current=current,
        ripple_V=max(f.voltage_max_V - f.voltage_min_V for f in frames),
        heatsink_degC=max(f.heatsink_degC for f in frames),
        limited=short or is_limited(frames[-1], demand_A),
        started_us=frames[0].time_us,
        ended_us=frames[-1].time_us,
    )
