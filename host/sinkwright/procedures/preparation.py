"""Before the first test: earlier faults cleared, limits in force, the current zero, a look at the source.

All of it with the gate clamped. The limits that were in force before are put back when the run is over.
"""

from __future__ import annotations

import contextlib
from collections.abc import AsyncIterator
from typing import TYPE_CHECKING

from sinkwright.errors import BoardRefused, LinkLost, SinkwrightError
from sinkwright.procedures.bench import INTERVAL_s
from sinkwright.procedures.gathering import gather
from sinkwright.procedures.preflight import check_source

if TYPE_CHECKING:
    from sinkwright.procedures.bench import Bench

_LIMIT_KEYS = ("current_A", "voltage_V", "power_W", "heatsink_degC")
#: The board gathers its zero from 64 conversions, about 0.3 s; much longer means that it never will.
ZERO_PATIENCE_s = 10.0
LOOK_s = 0.3


@contextlib.asynccontextmanager
async def limits_restored(bench: Bench) -> AsyncIterator[None]:
    """Put the plan's limits in force within, and the former ones back after it."""
    former = await bench.instrument.limits()
    wanted = {key: getattr(bench.plan.limits, key) for key in _LIMIT_KEYS}
    given = {key: value for key, value in wanted.items() if value is not None}
    if given:
        await bench.instrument.set_limits(**given)
    try:
        yield
    finally:
        if given:
            # A board that is gone, or in a fault, keeps the tighter limits: safe, and told by `limits`.
            with contextlib.suppress(LinkLost, BoardRefused), bench.instrument.finishing():
                await bench.instrument.set_limits(**{key: getattr(former, key) for key in given})


async def prepare(bench: Bench) -> None:
    """Clear, measure the zero, look at the source. Raises BoardRefused while a fault's cause stands."""
    await bench.off()
    await _clear_earlier_fault(bench)
    await bench.instrument.stream(INTERVAL_s)
    await _measure_zero(bench)
    await look_at_source(bench)


async def _clear_earlier_fault(bench: Bench) -> None:
    earlier = await bench.instrument.fault()
    if earlier is None:
        return
    await bench.instrument.clear()
    bench.warn(f"An earlier fault was cleared before this run: {earlier.sentence}")


async def _measure_zero(bench: Bench) -> None:
    bench.say("The load is off. Its current zero is measured with the gate clamped.")
    began_us = (await bench.next_frame()).time_us
    while True:
        status = await bench.instrument.status()
        if status.zero_samples:
            break
        frame = await bench.next_frame()
        if frame.time_us - began_us > ZERO_PATIENCE_s * 1e6:
            raise SinkwrightError(
                "the board does not finish measuring its current zero",
                load="The load is off.",
                remedy="Run `sinkwright off`, look at the board's log, and try again.",
            )
    bench.writer.add_event(
        status.time_us,
        "zero",
        f"With the gate clamped the current read {status.zero_current_A * 1000:.2f} mA, which is subtracted.",
        {"zero_current_A": status.zero_current_A, "samples": status.zero_samples},
    )


async def look_at_source(bench: Bench) -> None:
    """Read the open voltage and check the plan against it; warns, or raises as `check_source` does."""
    await bench.next_frame()
    point = await gather(bench, None, LOOK_s, "before the first test")
    frame = await bench.next_frame()
    for warning in check_source(bench.plan, bench.board, point.voltage.mean, frame.force_V):
        bench.warn(warning)
