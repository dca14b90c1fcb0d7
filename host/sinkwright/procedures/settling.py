"""Waits until readings stand still, by a stated criterion, and gives up honestly when they do not.

Criterion (ours; common practice, no source): over the last three frames, and not before `settle_s` has
passed since the set-point was reached, neither voltage nor current wanders by more than the largest of two
steps of the ADC, 0.05 % of the reading, and what the scatter inside one frame explains.
"""

from __future__ import annotations

from collections import deque
from typing import TYPE_CHECKING

from sinkwright.procedures.gathering import is_limited
from sinkwright_wire.messages import Limiting, State

if TYPE_CHECKING:
    from sinkwright.procedures.bench import Bench
    from sinkwright.sample import Sample

WINDOW = 3
SHARE = 0.0005
#: Given up after this many times `settle_s`, and never before 3 s.
PATIENCE = 10.0
LEAST_PATIENCE_s = 3.0


async def settle(bench: Bench, demand_A: float | None, settle_s: float) -> bool:
    """Wait for readings that stand still; False when they never did. The record keeps all frames."""
    began_us = bench.now_us
    patience_s = max(PATIENCE * settle_s, LEAST_PATIENCE_s)
    reached_us: int | None = None
    window: deque[Sample] = deque(maxlen=WINDOW)
    while True:
        frame = await bench.next_frame()
        if (frame.time_us - began_us) / 1e6 > patience_s:
            return False
        if not has_arrived(frame, demand_A):
            window.clear()
            reached_us = None
            continue
        if reached_us is None:
            # The frame in which the set-point was reached holds readings from before: it does not count.
            reached_us = frame.time_us
            continue
        if frame.pairs:
            window.append(frame)
        waited_s = (frame.time_us - reached_us) / 1e6
        if waited_s >= settle_s and len(window) == WINDOW and stands_still(bench, list(window)):
            return True


def has_arrived(frame: Sample, demand_A: float | None) -> bool:
    """Whether the load has stopped moving its set-point, or has run into the source's limit."""
    if demand_A is None:
        return frame.state != State.SINKING
    if frame.state != State.SINKING or frame.limiting == Limiting.RAMPING:
        return False
    return is_limited(frame, demand_A) or abs(frame.setpoint_A - demand_A) <= 0.002 + 0.002 * demand_A


def stands_still(bench: Bench, window: list[Sample]) -> bool:
    """The criterion at the head of this file."""
    board = bench.board
    step_V = board.adc.count_V * board.voltage_sense.ratio
    step_A = board.adc.count_V / board.current_sense.V_per_A
    scatter_V = max((f.voltage_max_V - f.voltage_min_V) / f.pairs**0.5 for f in window)
    scatter_A = max((f.current_max_A - f.current_min_A) / f.pairs**0.5 for f in window)
    return _quiet([f.voltage_V for f in window], step_V, scatter_V) and _quiet(
        [f.current_A for f in window], step_A, scatter_A
    )


def _quiet(values: list[float], step: float, scatter: float) -> bool:
    allowed = max(2 * step, SHARE * max(abs(v) for v in values), scatter)
    return max(values) - min(values) <= allowed
