"""The control step: what it measures, where it drives, and that it never touches the heap."""

from __future__ import annotations

import pytest

from tests.firmware.heap_check import ARRANGEMENTS, MEM_TOTAL, heap_check
from tests.firmware.running import on_board


def test_enabling_ramps_to_the_set_point_at_the_slew_limit() -> None:
    found = on_board("""
        session = Session()
        session.take_control()
        session.ask(wire.SET_LIMITS, struct.pack(wire.SET_LIMITS_FORMAT, 4_000_000, 30_000_000, 40_000_000,
                                                 85_000, 125_000, 10_000, 3_000))
        session.ask(wire.SET_POINT, struct.pack(wire.SET_POINT_FORMAT, wire.MODE_CURRENT, 1_000_000))
        session.board.show(0, 12_000_000)
        session.ask(wire.ENABLE, struct.pack(wire.ENABLE_FORMAT, wire.SILENCE_STOP, 0, 0))
        found = []
        for _ in range(60):
            session.turns(1)
            session.board.show(session.firmware.control.demand_uA, 12_000_000)
            found.append(session.firmware.control.demand_uA)
    """)
    steps = [after - before for before, after in zip(found, found[1:], strict=False)]
    assert max(steps) == 23_500  # 10 A/s for 2.35 ms
    assert min(steps) >= 0
    assert found[-1] == 1_000_000


def test_a_current_below_the_demand_is_a_state_and_not_a_fault() -> None:
    found = on_board("""
        session = Session()
        session.sink(2_000_000)
        session.board.show(700_000, 1_000_000)
        session.turns(12)
        limited = [session.firmware.control.limiting, session.firmware.guard.fault, session.board.gate.released]
        session.board.show(2_000_000, 12_000_000)
        session.turns(12)
        found = [limited, session.firmware.control.limiting]
    """)
    assert found == [[1, 0, True], 0]


def test_no_current_and_no_voltage_is_told_as_no_source() -> None:
    limiting = on_board("""
        session = Session()
        session.sink(2_000_000)
        session.board.show(0, 0)
        session.turns(12)
        found = session.firmware.control.limiting
    """)
    assert limiting == 4


def test_the_zero_is_measured_while_clamped_and_taken_from_every_reading() -> None:
    found = on_board("""
        session = Session()
        session.board.show(12_000, 12_000_000)
        session.take_control()
        control = session.firmware.control
        found = [control.zero_uA, control.zero_samples, session.firmware.meter.current_uA]
    """)
    assert found == [12_000, 64, 0]


def test_the_code_follows_the_readback_when_the_parts_are_off() -> None:
    """The converter is one percent high: the trim brings the readback, not the code, to the set-point."""
    found = on_board("""
        session = Session()
        session.sink(2_000_000)
        for _ in range(12):
            session.firmware.guard.quiet_steps = 0
            for _ in range(140):
                drawn = (session.board.bus.code - 124) * 82500 // 64 * 101 // 100
                session.board.show(drawn, 12_000_000)
                session.turns(1)
        found = session.firmware.meter.current_uA
    """)
    assert found == pytest.approx(2_000_000, abs=2_000)


def test_off_writes_code_zero_and_clamps() -> None:
    found = on_board("""
        session = Session()
        session.sink(2_000_000)
        session.ask(wire.DISABLE)
        session.board.show(0, 12_000_000)
        session.turns(2)
        found = [session.board.bus.code, session.board.gate.released, session.firmware.machine.state]
    """)
    assert found == [0, False, 0]


def test_a_conversion_that_is_not_ready_is_waited_for_and_not_taken() -> None:
    found = on_board("""
        session = Session()
        session.sink(1_000_000)
        session.board.bus.ready = False
        session.board.show(3_500_000, 12_000_000)
        session.turns(3)
        waiting = [session.firmware.meter.current_uA, session.firmware.guard.fault]
        session.board.show(1_010_000, 12_000_000)
        session.board.bus.ready = True
        session.turns(4)
        found = [waiting, session.firmware.guard.fault]
    """)
    assert found == [[pytest.approx(1_000_000, abs=1500), 0], 0]


def test_a_source_that_vanishes_clamps_in_the_step_whose_reading_shows_it() -> None:
    """Two readings are needed, a voltage and a current: the slow inputs between them cost a step at most."""
    found = on_board("""
        session = Session()
        session.sink(2_000_000)
        session.board.show(0, 0)
        steps = 0
        while session.board.gate.released:
            session.turns(1)
            steps += 1
        control = session.firmware.control
        found = [steps, control.demand_uA, session.board.bus.code, session.firmware.machine.state, control.limiting]
    """)
    assert found[0] <= 3
    assert found[1:] == [0, 0, 1, 4]


def test_a_source_that_came_back_is_loaded_by_the_ramp_once_its_voltage_stands_still() -> None:
    found = on_board("""
        session = Session()
        session.sink(2_000_000)
        session.ask(wire.SET_LIMITS, struct.pack(wire.SET_LIMITS_FORMAT, 4_000_000, 30_000_000, 40_000_000,
                                                 85_000, 125_000, 10_000, 3_000))
        session.board.show(0, 0)
        session.turns(10)
        # Contacts that bounce: the voltage stands still for 20 ms at most.
        released = 0
        for _ in range(8):
            for volt in (12_000_000, 3_000_000):
                session.board.show(0, volt)
                session.turns(8)
                released += session.board.gate.released
        session.board.show(0, 12_000_000)
        waited = 0
        while not session.board.gate.released:
            session.turns(1)
            waited += 1
        session.board.show(None, 12_000_000)
        demands = []
        for _ in range(100):
            session.turns(1)
            demands.append(session.firmware.control.demand_uA)
        found = [released, waited, demands, session.firmware.guard.fault]
    """)
    released, waited, demands, fault = found
    assert (released, fault) == (0, 0)
    assert waited * 2.35 == pytest.approx(75, abs=15)
    steps = [after - before for before, after in zip(demands, demands[1:], strict=False)]
    assert max(steps) == 23_500
    assert demands[-1] == 2_000_000


def test_a_shorted_source_is_one_that_limits_and_not_one_that_vanished() -> None:
    found = on_board("""
        session = Session()
        session.sink(2_000_000)
        session.board.show(50_000, 4_000)
        session.turns(40)
        found = [session.firmware.control.limiting, session.board.gate.released, session.firmware.machine.held]
    """)
    assert found == [1, True, False]


def test_the_law_in_force_is_told_with_its_set_point_in_its_own_unit() -> None:
    found = on_board("""
        session = Session()
        session.take_control()
        session.ask(wire.SET_POINT, struct.pack(wire.SET_POINT_FORMAT, wire.MODE_RESISTANCE, 6_500))
        status = struct.unpack(wire.STATUS_FORMAT, session.ask(wire.GET_STATUS)[1])
        found = [status[2], status[5]]
    """)
    assert found == [3, 6_500]


@pytest.mark.parametrize("name", ARRANGEMENTS)
def test_the_control_step_allocates_nothing(name: str) -> None:
    """Under heap_lock, where an allocation raises, and by an unchanged mem_total."""
    allocated, _, _ = on_board(heap_check(ARRANGEMENTS[name], figure=MEM_TOTAL))
    assert allocated == 0


def test_the_heap_check_would_notice_an_allocation() -> None:
    """The check itself is checked: a step that makes a list is found out."""
    found = on_board("""
        session = Session()
        session.sink(1_000_000)
        total = micropython.mem_total()
        total = micropython.mem_total()
        session.firmware.control.step()
        [1, 2, 3]
        found = micropython.mem_total() - total
    """)
    assert found > 0
