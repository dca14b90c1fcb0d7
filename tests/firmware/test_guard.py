"""What trips, at which reading, and how it is cleared: each fault latched with code, reading, limit and time."""

from __future__ import annotations

from typing import Any

import pytest

from tests.firmware.running import on_board

FAULTS = {
    "heatsink hot": ("session.board.show(None, 12_000_000, 86_000); session.turns(70)", 1, 86_000, 85_000),
    "over-current": ("session.board.show(4_600_000, 5_000_000); session.turns(4)", 3, 4_600_000, 4_400_000),
    "over-voltage": ("session.board.show(None, 30_100_000); session.turns(4)", 4, 30_100_000, 30_000_000),
    "over-power": ("session.firmware.control.ask(3_900_000); session.turns(8)", 5, 46_800_000, 42_500_000),
    "host silent": ("session.turns(1300)", 7, 3_000, 3_000),
    "thermistor open": ("session.board.bus.counts[3] = 26_100; session.turns(70)", 11, 26_100, 26_000),
    "thermistor short": ("session.board.bus.counts[3] = 10; session.turns(70)", 12, 10, 500),
    "current above demand": ("session.board.show(1_300_000, 12_000_000); session.turns(4)", 13, 1_300_000, 1_212_500),
    "reversed source": ("session.board.show(None, -1_000_000); session.turns(4)", 14, -1_000_000, -300_000),
    "loop late": ("session.board.clock.stall_us = 60_000; session.turns(2)", 15, 60_000, 50_000),
}  # fmt: skip


@pytest.mark.parametrize("name", FAULTS)
def test_a_fault_clamps_and_latches_code_reading_limit_and_time(name: str) -> None:
    arrange, code, value, limit = FAULTS[name]
    found: list[Any] = on_board(f"""
        session = Session()
        session.sink(1_000_000)
        before_us = session.firmware.time.now_us()
        {arrange}
        guard = session.firmware.guard
        found = [guard.fault, guard.value, guard.limit, guard.seconds * 10**6 + guard.micros - before_us,
                 session.board.gate.released, session.firmware.machine.state, session.board.bus.code]
    """)
    fault, reading, bound, after_us, released, state, dac_code = found
    assert (fault, released, state, dac_code) == (code, False, 3, 0)
    assert reading == pytest.approx(value, rel=0.03, abs=1500)
    assert bound == pytest.approx(limit, rel=0.001)
    assert 0 < after_us < 4_000_000


@pytest.mark.parametrize(("chip", "code"), [("0x48", 8), ("0x60", 9)])
def test_a_silent_chip_is_a_fault_with_the_bus_error(chip: str, code: int) -> None:
    found = on_board(f"""
        session = Session()
        session.sink(1_000_000)
        session.board.bus.silent = {chip}
        session.firmware.control.ask(1_500_000)
        session.turns(2)
        guard = session.firmware.guard
        found = [guard.fault, guard.value, session.board.gate.released]
    """)
    assert found == [code, 19, False]  # 19 is ENODEV, what MicroPython's I2C raises when nobody acknowledges


def test_a_converter_that_answers_for_another_input_is_a_fault_at_once() -> None:
    found = on_board("""
        session = Session()
        session.sink(1_000_000)
        session.board.bus.converting = False
        session.turns(3)
        found = [session.firmware.guard.fault, session.board.gate.released]
    """)
    assert found == [10, False]


def test_a_converter_that_never_gets_ready_is_a_fault_after_a_few_steps() -> None:
    found = on_board("""
        session = Session()
        session.sink(1_000_000)
        session.board.bus.ready = False
        session.turns(8)
        early = session.firmware.guard.fault
        session.turns(2)
        found = [early, session.firmware.guard.fault]
    """)
    assert found == [0, 10]


def test_current_although_clamped_replaces_any_other_fault() -> None:
    found = on_board("""
        session = Session()
        session.sink(1_000_000)
        session.board.show(4_600_000, 5_000_000)
        session.turns(20)
        guard = session.firmware.guard
        found = [guard.fault, guard.value, guard.limit]
    """)
    assert found == [6, 4_600_000, 60_000]


def test_current_just_after_clamping_is_not_taken_for_current_although_off() -> None:
    fault = on_board("""
        session = Session()
        session.sink(1_000_000)
        session.ask(wire.DISABLE)
        session.turns(2)
        session.board.show(None, 12_000_000)
        session.turns(20)
        found = session.firmware.guard.fault
    """)
    assert fault == 0


def test_the_first_fault_stays_until_it_is_cleared() -> None:
    found = on_board("""
        session = Session()
        session.sink(1_000_000)
        session.board.show(None, 31_000_000)
        session.turns(4)
        session.board.show(None, 12_000_000, 90_000)
        session.turns(140)
        found = session.firmware.guard.fault
    """)
    assert found == 4


def test_clearing_is_refused_while_the_cause_stands() -> None:
    found = on_board("""
        session = Session()
        session.sink(1_000_000)
        session.board.show(None, 31_000_000)
        session.turns(4)
        standing = session.refusal(wire.CLEAR_FAULT)
        session.board.show(None, 12_000_000)
        session.turns(4)
        gone = session.refusal(wire.CLEAR_FAULT)
        found = [standing, gone, session.firmware.guard.fault, session.firmware.machine.state]
    """)
    assert found == [[8, 0, 4], None, 0, 0]


def test_a_heatsink_must_cool_by_five_kelvin_before_it_is_cleared() -> None:
    found = on_board("""
        session = Session()
        session.sink(1_000_000)
        found = []
        for heatsink_mC in (86_000, 81_000, 79_000):
            session.board.show(None, 12_000_000, heatsink_mC)
            session.turns(140)
            found.append(session.refusal(wire.CLEAR_FAULT))
    """)
    assert found == [[8, 0, 1], [8, 0, 1], None]


def test_a_junction_too_hot_trips_although_the_heatsink_is_cool() -> None:
    found = on_board("""
        session = Session()
        stage = {"r_mK_per_W": 4000, "every_steps": 2, "share_x32768": 3000}
        session = Session(thermal={"stages": [stage]})
        session.sink(3_000_000)
        session.turns(200)
        guard = session.firmware.guard
        found = [guard.fault, guard.value > 125_000, session.firmware.meter.heatsink_mC < 30_000]
    """)
    assert found == [2, True, True]


def test_the_host_may_narrow_a_limit_and_the_narrower_one_trips() -> None:
    found = on_board("""
        session = Session()
        session.take_control()
        session.ask(wire.SET_LIMITS, struct.pack(wire.SET_LIMITS_FORMAT, 2_000_000, 10_000_000, 40_000_000,
                                                 85_000, 125_000, 400_000, 3_000))
        session.turns(4)
        found = [session.firmware.guard.fault, session.firmware.guard.limit]
    """)
    assert found == [4, 10_000_000]
