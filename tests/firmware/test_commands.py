"""What each command does on the board, and what it refuses by name."""

from __future__ import annotations

import pytest

from tests.firmware.running import on_board

BAD_VALUE, BEYOND_LIMIT, BEYOND_BOARD = 3, 4, 5
FAULT_LATCHED, NO_SETPOINT, ZERO_NOT_READY, ZERO_OUT_OF_BUDGET = 7, 12, 13, 14


@pytest.mark.parametrize(
    ("mode", "value", "refusal"),
    [
        (2, 40_000_000, None),
        (2, 40_000_001, [BEYOND_LIMIT, 3, 40_000_000]),
        (3, 1, None),
        (3, 0, [BAD_VALUE, 0, 0]),
        (4, 30_000_000, None),
        (4, 30_000_001, [BEYOND_LIMIT, 2, 30_000_000]),
        (4, 0, [BAD_VALUE, 0, 0]),
        (0, 1000, [BAD_VALUE, 0, 0]),
        (5, 1000, [BAD_VALUE, 0, 5]),
    ],
)
def test_a_set_point_of_any_mode_is_held_against_the_limit_in_its_own_unit(mode, value, refusal) -> None:
    found = on_board(f"""
        session = Session()
        session.take_control()
        found = session.refusal(wire.SET_POINT, struct.pack(wire.SET_POINT_FORMAT, {mode}, {value}))
    """)
    assert found == refusal


def test_limits_that_the_set_point_in_force_would_break_are_refused() -> None:
    found = on_board("""
        session = Session()
        session.take_control()
        session.ask(wire.SET_POINT, struct.pack(wire.SET_POINT_FORMAT, wire.MODE_POWER, 30_000_000))
        limits = lambda uW: struct.pack(wire.SET_LIMITS_FORMAT, 1_000_000, 20_000_000, uW, 85_000, 125_000,
                                        10_000, 3_000)
        found = [session.refusal(wire.SET_LIMITS, limits(29_000_000)),
                 session.refusal(wire.SET_LIMITS, limits(30_000_000))]
    """)
    assert found == [[BEYOND_LIMIT, 3, 30_000_000], None]


def test_a_set_point_beyond_the_limit_names_the_largest_that_fits() -> None:
    found = on_board("""
        session = Session()
        session.take_control()
        point = lambda uA: struct.pack(wire.SET_POINT_FORMAT, wire.MODE_CURRENT, uA)
        found = [session.refusal(wire.SET_POINT, point(4_000_001)), session.refusal(wire.SET_POINT, point(-1)),
                 session.refusal(wire.SET_POINT, point(4_000_000)), session.firmware.control.setpoint]
    """)
    assert found == [[BEYOND_LIMIT, 1, 4_000_000], [BAD_VALUE, 0, -1], None, 4_000_000]


def test_limits_beyond_the_boards_are_refused_with_the_field_and_the_largest() -> None:
    found = on_board("""
        session = Session()
        session.take_control()
        values = [4_000_000, 30_000_000, 40_000_000, 85_000, 125_000, 400_000, 3_000]
        found = []
        for field in range(7):
            wider = list(values)
            wider[field] += 1
            found.append(session.refusal(wire.SET_LIMITS, struct.pack(wire.SET_LIMITS_FORMAT, *wider)))
        nothing = [0] + values[1:]
        found.append(session.refusal(wire.SET_LIMITS, struct.pack(wire.SET_LIMITS_FORMAT, *nothing)))
    """)
    values = [4_000_000, 30_000_000, 40_000_000, 85_000, 125_000, 400_000, 3_000]
    assert found[:7] == [[BEYOND_BOARD, field + 1, value] for field, value in enumerate(values)]
    assert found[7] == [BAD_VALUE, 1, 0]


def test_switching_on_needs_a_set_point_a_zero_and_no_fault() -> None:
    found = on_board("""
        on = struct.pack(wire.ENABLE_FORMAT, wire.SILENCE_STOP, 0, 0)
        point = struct.pack(wire.SET_POINT_FORMAT, wire.MODE_CURRENT, 1_000_000)
        session = Session()
        session.ask(wire.HELLO, bytes([wire.VERSION, 0]))
        found = [session.refusal(wire.ENABLE, on)]
        session.ask(wire.SET_POINT, point)
        found.append(session.refusal(wire.ENABLE, on))
        session.board.show(55_000, 12_000_000)
        session.turns(160)
        found.append(session.refusal(wire.ENABLE, on))
        session.board.show(0, 31_000_000)
        session.turns(300)
        found.append(session.refusal(wire.ENABLE, on))
        found.append(session.board.gate.released)
    """)
    assert found[0] == [NO_SETPOINT, 0, 0]
    assert found[1][0] == ZERO_NOT_READY
    assert 0 < found[1][2] < 1000
    assert found[2] == [ZERO_OUT_OF_BUDGET, 0, 55_000]
    assert found[3] == [FAULT_LATCHED, 0, 4]
    assert found[4] is False


def test_the_status_tells_readings_zero_and_controller() -> None:
    found = on_board("""
        session = Session()
        session.sink(1_000_000)
        found = list(struct.unpack(wire.STATUS_FORMAT, session.ask(wire.GET_STATUS)[1]))
    """)
    time_us, state, mode, limiting, fault, setpoint, voltage, current = found[:8]
    assert time_us > 0
    assert (state, mode, limiting, fault, setpoint) == (1, 1, 0, 0, 1_000_000)
    assert voltage == pytest.approx(12e6, abs=1375)
    assert current == pytest.approx(1e6, abs=200)


def test_turning_on_right_after_turning_off_waits_for_conversions_that_saw_the_run_before() -> None:
    found = on_board("""
        session = Session()
        session.sink(1_000_000)
        enable = struct.pack(wire.ENABLE_FORMAT, wire.SILENCE_STOP, 0, 0)
        session.ask(wire.DISABLE)
        found = [session.refusal(wire.ENABLE, enable)]
        session.board.show(0, 12_000_000)
        session.turns(7)
        session.board.show(None, 12_000_000)
        found += [session.refusal(wire.ENABLE, enable), session.firmware.guard.fault]
    """)
    assert found == [[13, 0, 17], None, 0]


def test_no_command_of_the_wire_is_without_an_answer() -> None:
    unknown = on_board("""
        session = Session()
        table = session.firmware.dispatch._table
        requests = [name for name in dir(wire) if name + "_FORMAT" in dir(wire)
                    and isinstance(getattr(wire, name), int) and getattr(wire, name) < 0x40]
        found = [name for name in requests if getattr(wire, name) not in table]
    """)
    assert unknown == ["HELLO"]


def test_ends_that_make_no_sense_are_refused() -> None:
    refusal = on_board("""
        session = Session()
        session.take_control()
        found = session.refusal(wire.SET_ENDS, struct.pack(wire.SET_ENDS_FORMAT, -1, 0, 0, 1000, 0))
    """)
    assert refusal == [BAD_VALUE, 0, -1]
