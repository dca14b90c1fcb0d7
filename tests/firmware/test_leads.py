"""The sense pair beside the terminals: what leads and tolerances explain is no fault, and what they do not is one."""

from __future__ import annotations

import pytest

from tests.firmware.running import on_32_bit_board, on_board

SENSE_LEAD, REVERSED = 18, 14


def leads_seen(voltage_V: float, force_V: float, current_A: float) -> bool:
    """Whether three equal differences are called wrong, with the stand-in's band: 0.24 V, 2.6 % and 0.5 ohm."""
    found: bool = on_board(f"""
        from leads import Leads
        leads = Leads(IMAGE["sense"])
        for _ in range(3):
            leads.before_uV = {round(voltage_V * 1e6)}
            leads.see(leads.before_uV, {round(force_V * 1e6)}, {round(current_A * 1e6)})
        found = leads.wrong()
    """)
    return found


@pytest.mark.parametrize(
    ("voltage_V", "force_V", "current_A", "wrong"),
    [
        (12.0, 12.0, 0.0, False),
        (12.0, 12.5, 0.0, False),  # within 2.6 % and the offset
        (12.0, 10.2, 4.0, False),  # 0.45 ohm of leads at 4 A
        (12.0, 10.2, 0.1, True),  # the same drop without a current
        (12.0, 9.3, 4.0, True),  # more than the allowance
        (0.0, 12.0, 1.0, True),  # open
        (0.0, 0.9, 1.0, True),  # open, at a nickel cell
        (-1.1, 12.0, 1.0, True),  # swapped: the divider ends at its pedestal
        (12.0, 0.0, 0.0, True),  # a force lead is off
        (0.05, 0.0, 4.0, False),  # a shorted source, and little of it
    ],
)
def test_what_leads_and_tolerances_explain_is_no_fault(
    voltage_V: float, force_V: float, current_A: float, wrong: bool
) -> None:
    assert leads_seen(voltage_V, force_V, current_A) is wrong


def test_differences_that_alternate_are_ripple() -> None:
    found = on_board("""
        from leads import Leads
        leads = Leads(IMAGE["sense"])
        found = False
        for turn in range(40):
            leads.before_uV = 12_000_000
            leads.see(12_000_000, 10_000_000 if turn & 1 else 14_000_000, 0)
            found = found or leads.wrong()
    """)
    assert found is False


def test_a_step_of_the_load_between_the_readings_is_no_difference() -> None:
    """A pulse in time with the schedule: the terminals are always read beside the other level."""
    found = on_board("""
        from leads import Leads
        leads = Leads(IMAGE["sense"])
        found = []
        for _ in range(10):
            leads.before_uV = 3_700_000
            leads.see(2_900_000, 2_900_000, 4_000_000)
            leads.before_uV = 2_900_000
            leads.see(3_700_000, 3_700_000, 0)
            found.append(leads.out_of_band())
    """)
    assert not any(found)


def test_an_open_sense_lead_under_load_is_a_fault_with_the_difference() -> None:
    found = on_board("""
        session = Session()
        session.sink(1_000_000)
        session.board.show(None, 12_000_000)
        session.board.bus.counts[1] = 800
        guard = session.firmware.guard
        steps = 0
        while not guard.fault:
            session.turns(1)
            steps += 1
        found = [guard.fault, guard.value, guard.limit, steps, session.board.gate.released]
    """)
    fault, value, limit, steps, released = found
    assert (fault, released) == (SENSE_LEAD, False)
    assert value == pytest.approx(-12_000_000, abs=1500)
    assert limit == pytest.approx(-(0.24 + 12 * 26 / 1024) * 1e6, rel=0.02)
    assert steps <= 3 * 66 + 6


def test_cables_that_are_being_connected_are_no_fault_but_refuse_the_start() -> None:
    found = on_board("""
        session = Session()
        session.take_control()
        session.board.bus.counts[1] = 800
        session.turns(400)
        quiet = session.firmware.guard.fault
        session.ask(wire.SET_POINT, struct.pack(wire.SET_POINT_FORMAT, wire.MODE_CURRENT, 1_000_000))
        refused = session.refusal(wire.ENABLE, struct.pack(wire.ENABLE_FORMAT, wire.SILENCE_STOP, 0, 0))
        standing = session.refusal(wire.CLEAR_FAULT)
        session.board.show(0, 12_000_000)
        session.turns(70)
        found = [quiet, refused[:2], standing[0], session.refusal(wire.CLEAR_FAULT), session.firmware.guard.fault]
    """)
    assert found == [0, [7, 0], 8, None, 0]


def test_a_pair_that_is_swapped_is_told_from_a_source_that_is_reversed() -> None:
    """Both read below zero at once; the terminals' own voltage, a moment later, tells them apart."""
    found = on_board("""
        found = []
        for force_counts in (800 + 12_000_000 // 1375, 0):
            session = Session()
            session.sink(1_000_000)
            session.board.show(0, 12_000_000)
            session.board.bus.counts[1] = 0
            session.board.bus.counts[2] = force_counts
            session.turns(3)
            at_once = [session.firmware.guard.fault, session.board.gate.released]
            session.turns(70)
            found.append(at_once + [session.firmware.guard.fault])
    """)
    assert found == [[REVERSED, False, SENSE_LEAD], [REVERSED, False, REVERSED]]


def test_the_terminals_own_voltage_trips_where_the_pair_is_silent() -> None:
    found = on_board("""
        session = Session()
        session.sink(1_000_000)
        session.board.bus.counts[1] = 800
        session.board.bus.counts[2] = 26_000
        session.turns(70)
        guard = session.firmware.guard
        found = [guard.fault, guard.value, guard.limit]
    """)
    assert found == [4, (26_000 - 800) * 1375, (23_400 - 800) * 1375]


def test_what_the_leads_keep_does_not_count_as_heat_of_the_sink() -> None:
    found = on_board("""
        from leads import Leads
        leads = Leads(IMAGE["sense"])
        leads.note_share(10_000_000, 8_000_000)
        found = [leads.share_x256]
        for _ in range(20):
            leads.note_share(10_000_000, 10_000_000)
        found.append(leads.share_x256)
    """)
    assert found[0] == pytest.approx(0.8 * 256, abs=1)
    assert found[1] == found[0] + 20


def test_every_product_stays_within_31_bits() -> None:
    """The widest bands that a board file can have, and every end of the meter's range."""
    found = on_32_bit_board("""
        from leads import Leads
        leads = Leads({"fixed_uV": 40_000_000, "share_x1024": 420, "lead_mohm": 10_000})
        voltages = (-80_000_000, -1, 0, 1, 80_000_000)
        def run():
            for voltage_uV in voltages:
                for force_uV in voltages:
                    leads.before_uV = voltage_uV
                    leads.see(voltage_uV, force_uV, 16_000_000)
                    leads.see(voltage_uV, force_uV, -16_000_000)
                    leads.note_share(voltage_uV, force_uV)
        micropython.heap_lock()
        try:
            run()
            found = True
        except MemoryError:
            found = False
        micropython.heap_unlock()
    """)
    assert found
