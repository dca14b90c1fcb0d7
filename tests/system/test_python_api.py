"""`sinkwright.connect` on the simulated board with the true firmware."""

from __future__ import annotations

import asyncio
import time
from pathlib import Path

import pytest

import sinkwright
from sinkwright import instrument
from sinkwright.errors import BoardRefused
from sinkwright.readings import LoadEvent
from sinkwright.transport import Channel, open_channel
from sinkwright_wire.vocabulary import EventKind, State

SUPPLY = """\
kind = "supply"
voltage_V = 12.0
resistance_ohm = 0.5
"""


@pytest.fixture
def supply(tmp_path: Path) -> Path:
    path = tmp_path / "supply.toml"
    path.write_text(SUPPLY)
    return path


def test_the_voltage_falls_by_current_times_resistance(supply: Path) -> None:
    # Ohm's law: V = Voc - I * Rs. Uncalibrated parts: 1 % of gain and some mV of offset are to be expected.
    with sinkwright.connect(f"sim:{supply},speed=max,seed=3") as load:
        open_circuit_V = load.measure().voltage_V
        load.set_current(2.0)
        load.on(for_s=10)
        load.wait(1)
        sample = load.measure()
    assert sample.current_A == pytest.approx(2.0, rel=0.03)
    assert open_circuit_V - sample.voltage_V == pytest.approx(1.0, rel=0.05)


def test_equal_seeds_give_equal_samples(supply: Path) -> None:
    def measure() -> list[tuple[int, int, int]]:
        with sinkwright.connect(f"sim:{supply},speed=max,seed=5") as load:
            load.set_current(1.0)
            load.on(for_s=2)
            return [(sample.time_us, sample.voltage_uV, sample.current_uA) for sample in load.samples()]

    assert measure() == measure()


def test_it_works_inside_a_running_event_loop(supply: Path) -> None:
    async def notebook_cell() -> float:
        with sinkwright.connect(f"sim:{supply},speed=max") as load:
            load.set_current(1.0)
            load.on(for_s=10)
            load.wait(0.5)
            return load.measure().current_A

    assert asyncio.run(notebook_cell()) == pytest.approx(1.0, rel=0.03)


def test_the_largest_current_that_fits_is_named(supply: Path) -> None:
    with (
        sinkwright.connect(f"sim:{supply},speed=max") as load,
        pytest.raises(BoardRefused, match="the largest that fits is 4 A"),
    ):
        load.set_current(5.0)


def test_at_real_time_the_board_hears_a_script_that_sleeps_and_turns_off_in_time(supply: Path) -> None:
    with sinkwright.connect(f"sim:{supply}") as load:
        load.set_limits(silence_s=0.5)
        load.set_current(1.0)
        load.on(for_s=1.5)
        time.sleep(1.0)
        assert load.status().state == State.SINKING
        time.sleep(1.0)
        assert load.status().state == State.OFF


class LossyChannel(Channel):
    """Loses every third chunk that arrives, and the tail of every fifth."""

    simulated = True
    lock_step = True

    def __init__(self, inner: Channel) -> None:
        self.url = inner.url
        self._inner = inner
        self._count = 0

    async def receive(self, timeout_s: float) -> bytes:
        data = await self._inner.receive(timeout_s)
        self._count += bool(data)
        if self._count % 3 == 0:
            return b""
        return data[:-5] if self._count % 5 == 0 else data

    def send(self, data: bytes) -> None:
        self._inner.send(data)

    def now_s(self) -> float:
        return self._inner.now_s()

    def close(self) -> None:
        self._inner.close()


def test_on_a_lossy_line_every_command_acts_once(supply: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(instrument, "open_channel", lambda url: LossyChannel(open_channel(url)))
    with sinkwright.connect(f"sim:{supply},speed=max") as load:
        events: list[LoadEvent] = []
        load.instrument.on_event.append(events.append)
        for current_A in (0.5, 1.0, 1.5):
            load.set_current(current_A)
            load.on(for_s=5)
            load.wait(0.5)
            assert load.status().setpoint_SI == current_A
            load.off()
        load.measure()
        counters = load.instrument.link.counters
    enabled = [event.number for event in events if event.kind == EventKind.ENABLED]
    assert counters.retries > 0
    assert len(enabled) == len(set(enabled)) <= 3
