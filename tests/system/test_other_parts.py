"""Boards of other parts than the shipped one's: the same firmware, chosen by names in the board file."""

from __future__ import annotations

import asyncio
import re
from collections.abc import Awaitable, Callable
from pathlib import Path
from typing import TypeVar

import pytest

from sinkwright.instrument import Instrument
from sinkwright.readings import LoadStatus
from sinkwright.templates import template
from sinkwright_wire.vocabulary import State

Found = TypeVar("Found")
SOURCE = 'kind = "supply"\nvoltage_V = 12.0\nresistance_ohm = 0.1\n'


def on_a_board(folder: Path, text: str, work: Callable[[Instrument], Awaitable[Found]]) -> Found:
    source, board = folder / "source.toml", folder / "board.toml"
    source.write_text(SOURCE)
    board.write_text(text)

    async def run() -> Found:
        async with await Instrument.open(f"sim:{source},board={board},speed=max,seed=1") as load:
            return await work(load)

    return asyncio.run(run())


async def hold_one_ampere(load: Instrument) -> LoadStatus:
    await load.set_current(1.0)
    await load.on()
    await load.pause(2.0)
    return await load.status()


def test_the_cheapest_board_has_no_converter_but_the_microcontroller_s_own(tmp_path: Path) -> None:
    """Twelve bits of PWM, 8.7 effective bits of ADC: percents instead of per mille, and the load holds."""
    text = re.sub(r'^part = "MCP4725"', 'pin = 10\npart = "PWM"', template("board"), flags=re.MULTILINE)
    text = re.sub(r'^part = "ADS1115"', 'part = "RP2"', text, flags=re.MULTILINE)
    status = on_a_board(tmp_path, text.replace("range_V = 4.096", "range_V = 3.3"), hold_one_ampere)
    assert (status.state, status.fault) == (State.SINKING, 0)
    assert status.current_A == pytest.approx(1.0, abs=0.03)
    assert status.voltage_V == pytest.approx(11.9, abs=0.15)
    assert 15 < status.heatsink_degC < 40


def test_a_board_with_a_second_trip_passes_its_self_test_and_sinks(tmp_path: Path) -> None:
    monitor = "[monitor]\nshunt_ohm = 0.01\nalert_pin = 21\n\n[current_sense]\n"
    text = template("board").replace("[current_sense]\n", monitor)
    status = on_a_board(tmp_path, text, hold_one_ampere)
    assert (status.state, status.fault) == (State.SINKING, 0)
    assert status.current_A == pytest.approx(1.0, abs=0.01)
