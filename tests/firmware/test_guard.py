"""What trips, at which reading, and how it is cleared: each fault latched with code, reading, limit and time."""

from __future__ import annotations

from typing import Any

import pytest

from sinkwright_wire.vocabulary import Fault
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
        # The load would derate long before: as if it did not know of its junction.
        session.firmware.guard._derating._junction_mK_per_W = 1
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


#: How each fault is brought about while sinking 1 A, and what puts it right; readings come back within 140 turns.
CAUSES = {
    1: ("session.board.show(None, 12_000_000, 86_000)", "session.board.show(0, 12_000_000, 25_000)"),
    4: ("session.board.show(None, 30_100_000)", "session.board.show(0, 12_000_000)"),
    6: ("session.board.show(1_300_000, 12_000_000)", "session.board.show(0, 12_000_000)"),
    7: ("guard.quiet_steps = 1277", "guard.quiet_steps = 0"),
    8: ("session.board.bus.silent = 0x48", "session.board.bus.silent = 0"),
    9: (
        "session.board.bus.silent = 0x60; session.firmware.control.ask(0); session.turns(2);"
        "session.board.show(0, 12_000_000)",
        "session.board.bus.silent = 0",
    ),
    10: ("session.board.bus.ready = False", "session.board.bus.ready = True"),
    11: ("session.board.bus.counts[3] = 26_100", "session.board.show(0, 12_000_000, 25_000)"),
    12: ("session.board.bus.counts[3] = 10", "session.board.show(0, 12_000_000, 25_000)"),
    14: ("session.board.show(None, -1_000_000)", "session.board.show(0, 12_000_000)"),
    18: ("session.board.bus.counts[1] = 800", "session.board.show(0, 12_000_000)"),
    19: ("session.board.show(None, 12_000_000, -19_000)", "session.board.show(0, 12_000_000, 25_000)"),
    20: ("session.board.show(None, 12_000_000, 70_000)", "session.board.show(0, 12_000_000, 25_000)"),
    22: ("session.board.bus.starting = False", "session.board.bus.starting = True"),
}


@pytest.mark.parametrize("code", CAUSES)
def test_no_fault_is_cleared_while_its_cause_stands_and_every_one_afterwards(code: int) -> None:
    """Only the frames that ask come from the host; for its silence, asking is what ends the cause."""
    arrange, mend = CAUSES[code]
    standing, cleared, state = on_board(f"""
        session = Session()
        session.sink(1_000_000)
        guard = session.firmware.guard
        {arrange}
        session.turns(270)
        before = guard.fault
        standing = guard.standing()
        if {code} != wire.FAULT_HOST_SILENT:
            standing = standing and session.refusal(wire.CLEAR_FAULT)
        {mend}
        session.turns(140)
        found = [[before, standing], session.refusal(wire.CLEAR_FAULT), session.firmware.machine.state]
    """)
    assert standing == [code, True if code == 7 else [8, 0, code]]
    assert cleared is None
    assert state == 0


@pytest.mark.parametrize("name", ["over-current", "over-power", "current above demand"])
def test_a_current_that_ended_with_the_gate_stands_no_more(name: str) -> None:
    """Had it not ended, it would be current although off, which does stand."""
    arrange, code, _, _ = FAULTS[name]
    found = on_board(f"""
        session = Session()
        session.sink(1_000_000)
        {arrange}
        session.board.show(0, 12_000_000)
        session.turns(12)
        found = [session.firmware.guard.fault, session.firmware.guard.standing(), session.refusal(wire.CLEAR_FAULT)]
    """)
    assert found == [code, False, None]


@pytest.mark.parametrize("code", [16, 17])
def test_what_only_a_start_puts_right_is_not_cleared(code: int) -> None:
    refusal = on_board(f"""
        session = Session()
        session.take_control()
        session.firmware.guard.latch({code}, 0, 0)
        found = session.refusal(wire.CLEAR_FAULT)
    """)
    assert refusal == [8, 0, code]


def test_every_fault_of_the_wire_has_a_cause_to_look_for() -> None:
    """All but SUPPLY_LOW, which no part of this board measures."""
    known = on_board("found = sorted(Session().firmware.guard._stands)")
    assert known == sorted(fault for fault in Fault if fault is not Fault.SUPPLY_LOW)


def test_a_converter_that_answers_but_begins_nothing_is_found_by_its_ready_flag() -> None:
    """Its register reads back as written and ready at once: the results are old, and no code tells."""
    found = on_board("""
        session = Session()
        session.sink(1_000_000)
        session.board.bus.starting = False
        guard = session.firmware.guard
        steps = 0
        while not guard.fault:
            session.turns(1)
            steps += 1
        found = [guard.fault, hex(guard.value & 0x8FFF), steps, session.board.gate.released]
    """)
    fault, register, steps, released = found
    assert (fault, released) == (22, False)
    assert register == "0x83e3"  # SBAS444: idle, 4.096 V, single shot, 860/s, comparator off
    assert steps <= 2 * 33 + 1


def test_a_probe_costs_one_transaction_in_33_steps() -> None:
    found = on_board("""
        session = Session()
        session.sink(1_000_000)
        count = [0]
        read = session.board.bus.readfrom_mem_into
        def counted(address, register, buffer):
            count[0] += 1
            read(address, register, buffer)
        session.board.bus.readfrom_mem_into = counted
        session.turns(66)
        found = count[0]
    """)
    assert found == 2 * 66 + 2


CALIBRATED = """
        from scaling import Scale
        def calibrated(name, whole, zero_counts):
            session = Session()
            firmware = session.firmware
            scale = firmware.control._current if name == "current" else firmware.control._voltage
            scale.calibrate({"zero_counts": zero_counts, "whole": whole, "part": 0, "offset": 0})
            firmware.guard.apply(firmware.guard.limits)
            return session
"""


@pytest.mark.parametrize(("whole", "shown_V"), [(1300, 30.05), (1450, 28.7)])
def test_the_worse_of_the_nominal_and_the_calibrated_voltage_trips(whole: int, shown_V: float) -> None:
    """The nominal line trips although the calibration reads less, and the calibration although the nominal does."""
    found = on_board(f"""{CALIBRATED}
        session = calibrated("voltage", {whole}, 800)
        session.turns(10)
        before = session.firmware.guard.fault
        session.board.show(0, {round(shown_V * 1e6)})
        session.turns(4)
        guard = session.firmware.guard
        found = [before, guard.fault, guard.value > 30_000_000]
    """)
    assert found == [0, 4, True]


@pytest.mark.parametrize(("whole", "shown_A"), [(150, 4.45), (250, 3.6)])
def test_the_worse_of_the_nominal_and_the_calibrated_current_trips(whole: int, shown_A: float) -> None:
    found = on_board(f"""{CALIBRATED}
        session = calibrated("current", {whole}, 800)
        session.sink(3_000_000)
        session.firmware.guard.latch = lambda fault, value, limit: seen.append([fault, value])
        seen = []
        session.board.show({round(shown_A * 1e6)}, 5_000_000)
        session.turns(2)
        found = seen
    """)
    assert 3 in [fault for fault, _ in found]
    assert all(value >= 4_400_000 for fault, value in found if fault == 3)


def test_a_calibration_cannot_move_a_trip_past_the_hard_counts() -> None:
    """Both lines ten times too flat, as an image gone wrong would have them: the raw counts trip all the same."""
    found = on_board("""
        scales = {name: dict(IMAGE["scales"][name]) for name in IMAGE["scales"]}
        scales["voltage"]["whole"] = 137
        scales["current"]["whole"] = 20
        session = Session(scales=scales)
        found = []
        for current_uA, voltage_uV in ((0, 30_400_000), (4_500_000, 5_000_000)):
            session.firmware.guard.fault = 0
            session.board.show(current_uA, voltage_uV)
            session.turns(3)
            found.append(session.firmware.guard.fault)
    """)
    assert found == [4, 3]


def test_a_heatsink_trips_by_raw_counts_whatever_its_table_says() -> None:
    fault = on_board("""
        thermistor = dict(IMAGE["thermistor"], mC=[50000, 40000, 25000, 0, -20000])
        session = Session(thermistor=thermistor)
        session.board.bus.counts[3] = 3_000
        session.turns(70)
        found = session.firmware.guard.fault
    """)
    assert fault == 1


def test_limits_from_anywhere_only_narrow_the_boards_own() -> None:
    found = on_board("""
        guard = Session().firmware.guard
        guard.apply_values([9_000_000, 5_000_000, 99_000_000, 70_000, 200_000, 10, 9_000])
        found = guard.limits.values()
    """)
    assert found == [4_000_000, 5_000_000, 40_000_000, 70_000, 125_000, 10, 3_000]


def test_a_current_that_stays_away_while_the_voltage_stands_is_a_fault_of_the_sink() -> None:
    """A source that limits is pulled down to what a short circuit leaves: 650 mohm here, and half a volt."""
    missing, limited = on_board("""
        found = []
        for current_uA, voltage_uV in ((20_000, 12_000_000), (700_000, 900_000)):
            session = Session()
            session.sink(2_000_000)
            session.board.show(current_uA, voltage_uV)
            session.turns(40)
            found.append([session.firmware.guard.fault, session.board.gate.released])
    """)
    assert missing == [23, False]
    assert limited == [0, True]
