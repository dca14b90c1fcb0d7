"""When readings count as settled, and when waiting is given up."""

from __future__ import annotations

import asyncio
from typing import Any

import pytest

from sinkwright.definitions.loading import load_board, parse_plan
from sinkwright.procedures.bench import Bench, INTERVAL_s
from sinkwright.procedures.progress import Progress
from sinkwright.procedures.settling import settle
from sinkwright.stopping import StopRequest
from sinkwright_wire.messages import Limiting
from tests.support.fake_instrument import FakeInstrument, FakeSource, FakeWriter


def settled(
    source: FakeSource, demand_A: float | None, settle_s: float, **settings: Any
) -> tuple[bool, float]:
    """Whether it settled, and after how many seconds of the board's clock."""
    load: Any = FakeInstrument(source, **settings)
    writer: Any = FakeWriter()
    plan = parse_plan('[[test]]\nkind = "rest"\nduration_s = 1.0\n', "plan")
    bench = Bench(load, plan, load_board(), writer, Progress(), StopRequest())

    async def wait() -> bool:
        await load.stream(INTERVAL_s)
        if demand_A is not None:
            await bench.sink(demand_A)
        return await settle(bench, demand_A, settle_s)

    return asyncio.run(wait()), load.time_us / 1e6


def test_steady_readings_settle_as_soon_as_the_wait_is_over():
    steady, after_s = settled(FakeSource(), 1.0, 2.0)
    assert steady
    assert after_s == pytest.approx(2.0, abs=0.3)


def test_a_voltage_that_still_creeps_is_waited_for():
    steady, after_s = settled(FakeSource(wander=lambda number: -0.5 * 0.8**number), 1.0, 0.3)
    assert steady
    assert after_s > 1.0


def test_a_voltage_that_never_stands_still_is_given_up_after_ten_times_the_wait():
    steady, after_s = settled(FakeSource(wander=lambda number: 0.3 * (number % 2)), 1.0, 0.5)
    assert not steady
    assert after_s == pytest.approx(5.0, abs=0.3)


def test_a_ramp_does_not_count_as_having_arrived():
    steady, _ = settled(
        FakeSource(),
        1.0,
        0.3,
        at_frame={0: lambda load: setattr(load, "limiting", Limiting.RAMPING)},
    )
    assert not steady


def test_a_source_in_its_limit_can_settle_below_the_demand():
    steady, _ = settled(FakeSource(limit_A=0.5), 1.0, 0.3)
    assert steady
