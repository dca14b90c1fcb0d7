"""Each end is kept by the board alone: nobody speaks to it after the run has begun, and the gate is clamped."""

from __future__ import annotations

from typing import Any

import pytest

from tests.firmware.running import on_32_bit_board, on_board

ENDED, SINKING = 2, 1
VOLTAGE, CHARGE, ENERGY, DURATION, TEMPERATURE = 1, 2, 3, 4, 5
PERIOD_us = 2350

#: A run of 1 A at 12 V that may go on alone: the host falls silent with its Enable. 2000 turns are 4.7 s, beyond
#: the silence limit of 3 s.
ALONE = """
    session = Session()
    session.take_control()
    session.ask(wire.SET_POINT, struct.pack(wire.SET_POINT_FORMAT, wire.MODE_CURRENT, 1_000_000))
    session.ask(wire.SET_ENDS, struct.pack(wire.SET_ENDS_FORMAT, {ends}))
    session.board.show(None, 12_000_000, 25_000)
    refused = session.refusal(wire.ENABLE, struct.pack(wire.ENABLE_FORMAT, wire.SILENCE_CONTINUE, 77, 0))
    assert refused is None, refused
    {then}
    board = session.board
    before = [session.firmware.machine.state, board.gate.released]
    {more}
    run = struct.unpack(wire.RUN_FORMAT, session.ask(wire.GET_RUN, session=9)[1])
    found = [before, [session.firmware.machine.state, board.gate.released, board.led.state], list(run)]
"""


def alone(ends: str, then: str, more: str) -> tuple[list[Any], list[Any], list[Any]]:
    before, after, run = on_board(ALONE.format(ends=ends, then=then, more=more))
    return before, after, run


def test_the_end_voltage_ends_a_run_long_after_the_host_has_gone() -> None:
    before, after, run = alone(
        "11_000_000, 0, 0, 3_600_000, 0",
        "session.turns(2000)",
        "session.board.show(None, 10_900_000); session.turns(30)",
    )
    assert before == [SINKING, True]
    assert after == [ENDED, False, ENDED]
    assert run[:5] == [77, ENDED, VOLTAGE, 0, 1]


def test_a_dip_shorter_than_a_few_mains_periods_does_not_end_a_run() -> None:
    before, after, _ = alone(
        "11_000_000, 0, 0, 3_600_000, 0",
        "session.turns(100); session.board.show(None, 10_900_000); session.turns(12)",
        "session.board.show(None, 12_000_000); session.turns(100)",
    )
    assert (before, after) == ([SINKING, True], [SINKING, True, SINKING])


def test_the_charge_ends_a_run_to_within_a_voltage_current_pair() -> None:
    before, after, run = alone("1_000_000, 2000, 0, 0, 0", "session.turns(800)", "session.turns(80)")
    assert before == [SINKING, True]
    assert after == [ENDED, False, ENDED]
    assert run[2] == CHARGE
    assert 2_000_000 <= run[7] < 2_000_000 + 3 * PERIOD_us


def test_the_energy_ends_a_run_to_within_a_voltage_current_pair() -> None:
    before, after, run = alone(
        "1_000_000, 0, 24_000, 3_600_000, 0", "session.turns(800)", "session.turns(80)"
    )
    assert before == [SINKING, True]
    assert after == [ENDED, False, ENDED]
    assert run[2] == ENERGY
    assert 24_000_000 <= run[8] < 24_000_000 + 12 * 3 * PERIOD_us


def test_the_time_ends_a_run_to_within_a_few_control_steps() -> None:
    before, after, run = alone("1_000_000, 0, 0, 5000, 0", "session.turns(2120)", "session.turns(20)")
    assert before == [SINKING, True]
    assert after == [ENDED, False, ENDED]
    assert run[2] == DURATION
    assert 5_000_000 <= run[6] - run[5] <= 5_000_000 + 5 * PERIOD_us


def test_the_temperature_ends_a_run() -> None:
    before, after, run = alone(
        "1_000_000, 0, 0, 3_600_000, 50_000",
        "session.turns(200)",
        "session.board.show(None, 12_000_000, 50_500); session.turns(150)",
    )
    assert before == [SINKING, True]
    assert after == [ENDED, False, ENDED]
    assert run[2] == TEMPERATURE


@pytest.mark.parametrize(
    ("milli", "which"), [(604_800, "charge"), (2_419_200_000, "charge"), (4_294_967_295, "energy")]
)
def test_a_week_keeps_the_resolution_of_its_meters(milli: int, which: str) -> None:
    """604.8 C are a week of 1 mA, 2419.2 kC a week of 4 A. Ends at the very microampere-step, in small integers."""
    arguments = f"0, {milli}, 0, 0, 0" if which == "charge" else f"0, 0, {milli}, 0, 0"
    found = on_32_bit_board(f"""
        session = Session()
        session.sink(1_000_000)
        parts = session.firmware
        parts.ends.ask({arguments})
        high = parts.ends._{which}_high
        low = parts.ends._{which}_low
        found = [high, low]
        for below in (1, 0):
            parts.meter.{which}.high = high
            parts.meter.{which}.low = low - below
            parts.ends.check()
            found.append(parts.machine.state)
    """)
    high, low, below, at = found
    assert (high << 26) + low == -(-milli * 1000 * 1_000_000 // PERIOD_us)
    assert low > 0
    assert high < 1 << 30
    assert (below, at) == (SINKING, ENDED)


def test_ends_are_forgotten_with_their_run() -> None:
    found = on_board("""
        session = Session()
        session.sink(1_000_000)
        session.ask(wire.SET_ENDS, struct.pack(wire.SET_ENDS_FORMAT, 0, 0, 0, 500, 0))
        session.turns(300)
        found = [session.firmware.machine.state]
        session.ask(wire.DISABLE)
        session.ask(wire.ENABLE, struct.pack(wire.ENABLE_FORMAT, wire.SILENCE_STOP, 0, 0))
        session.turns(300)
        found.append(session.firmware.machine.state)
    """)
    assert found == [ENDED, SINKING]


def test_ends_may_be_changed_while_the_run_goes_on_and_count_from_its_start() -> None:
    found = on_board("""
        session = Session()
        session.sink(1_000_000)
        session.turns(400)
        session.ask(wire.SET_ENDS, struct.pack(wire.SET_ENDS_FORMAT, 0, 0, 0, 500, 0))
        session.turns(4)
        found = session.firmware.machine.state
    """)
    assert found == ENDED


def test_an_end_is_told_as_an_event() -> None:
    found = on_board("""
        session = Session()
        session.sink(1_000_000)
        session.ask(wire.SET_ENDS, struct.pack(wire.SET_ENDS_FORMAT, 0, 0, 0, 500, 0))
        del session.sent[:]
        session.turns(300)
        events = [struct.unpack(wire.EVENT_FORMAT, sent[3]) for sent in session.sent if sent[0] == wire.EVENT]
        found = [list(event[2:4]) for event in events]
    """)
    assert [9, DURATION] in found


def test_a_fault_comes_before_an_end() -> None:
    found = on_board("""
        session = Session()
        session.sink(1_000_000)
        session.ask(wire.SET_ENDS, struct.pack(wire.SET_ENDS_FORMAT, 13_000_000, 0, 0, 0, 0))
        session.board.show(None, 31_000_000)
        session.turns(60)
        run = struct.unpack(wire.RUN_FORMAT, session.ask(wire.GET_RUN)[1])
        found = [session.firmware.machine.state, run[2]]
    """)
    assert found == [3, 7]
