"""Commands on the board: who may give them, once each, and what is refused by name."""

from __future__ import annotations

import pytest

from tests.firmware.running import on_board

UNKNOWN_COMMAND, BAD_LENGTH, BAD_VALUE, BEYOND_LIMIT, BEYOND_BOARD, NOT_OFFERED = 1, 2, 3, 4, 5, 6
FAULT_LATCHED, NOT_IN_CONTROL, OUT_OF_SEQUENCE, NO_SETPOINT = 7, 9, 10, 12
ZERO_NOT_READY, ZERO_OUT_OF_BUDGET, WRONG_VERSION = 13, 14, 16


def test_a_host_that_says_hello_first_is_in_control_and_a_second_is_told_so() -> None:
    found = on_board("""
        session = Session()
        first = session.ask(wire.HELLO, bytes([wire.VERSION, 0]), session=1, sequence=1)
        second = session.ask(wire.HELLO, bytes([wire.VERSION, 0]), session=2, sequence=1)
        found = [struct.unpack(wire.HELLO_REPLY_FORMAT, reply[1])[8:] for reply in (first, second)]
        found = [[bool(a), b] for a, b in found]
    """)
    (first_in, first_other), (second_in, second_other) = found
    assert (first_in, first_other) == (True, 0xFFFFFFFF)
    assert second_in is False
    assert second_other < 10


def test_a_second_host_may_ask_and_switch_off_but_nothing_else() -> None:
    found = on_board("""
        session = Session()
        session.sink(1_000_000)
        status = session.ask(wire.GET_STATUS, session=2, sequence=9)
        point = struct.pack(wire.SET_POINT_FORMAT, wire.MODE_CURRENT, 2_000_000)
        refused = session.refusal(wire.SET_POINT, point, session=2, sequence=10)
        done = session.ask(wire.DISABLE, session=2, sequence=11)
        found = [status[0], refused, done[0], session.board.gate.released, session.firmware.control.setpoint_uA]
    """)
    assert found == [0x88, [NOT_IN_CONTROL, 0, 1], 0xC0, False, 1_000_000]


def test_a_controller_that_went_quiet_gives_way() -> None:
    found = on_board("""
        session = Session()
        session.take_control()
        session.turns(1300)
        reply = session.ask(wire.HELLO, bytes([wire.VERSION, 0]), session=2, sequence=1)
        found = bool(struct.unpack(wire.HELLO_REPLY_FORMAT, reply[1])[8])
    """)
    assert found is True


def test_a_controller_may_give_up_control_at_once() -> None:
    found = on_board("""
        session = Session()
        session.take_control()
        session.ask(wire.HELLO, bytes([wire.VERSION, 1]))
        reply = session.ask(wire.HELLO, bytes([wire.VERSION, 0]), session=2, sequence=1)
        found = bool(struct.unpack(wire.HELLO_REPLY_FORMAT, reply[1])[8])
    """)
    assert found is True


def test_a_repeated_command_gets_the_same_reply_and_acts_once() -> None:
    found = on_board("""
        session = Session()
        session.sink(1_000_000)
        session.ask(wire.DISABLE)
        session.board.show(0, 12_000_000)
        session.turns(10)
        enable = bytes([wire.SILENCE_STOP])
        first = session.ask(wire.ENABLE, enable)
        session.firmware.machine.fire(1)  # something else turned it off: a repetition must not turn it on again
        again = session.ask(wire.ENABLE, enable, sequence=session.sequence)
        found = [first == again, session.board.gate.released]
    """)
    assert found == [True, False]


def test_a_command_out_of_sequence_is_refused_and_changes_nothing() -> None:
    found = on_board("""
        session = Session()
        session.take_control()
        point = struct.pack(wire.SET_POINT_FORMAT, wire.MODE_CURRENT, 2_000_000)
        found = [session.refusal(wire.SET_POINT, point, sequence=number) for number in (0, 7, 40_000)]
        found.append(session.firmware.control.setpoint_uA)
    """)
    assert [refusal[0] for refusal in found[:3]] == [OUT_OF_SEQUENCE] * 3
    assert found[3] == 0


def test_a_late_repetition_of_an_old_hello_does_not_make_old_commands_new() -> None:
    found = on_board("""
        session = Session()
        session.take_control()
        point = struct.pack(wire.SET_POINT_FORMAT, wire.MODE_CURRENT, 2_000_000)
        session.ask(wire.SET_POINT, point)
        session.ask(wire.SET_POINT, struct.pack(wire.SET_POINT_FORMAT, wire.MODE_CURRENT, 500_000))
        session.ask(wire.HELLO, bytes([wire.VERSION, 0]), sequence=1)
        found = [session.refusal(wire.SET_POINT, point, sequence=2)[0], session.firmware.control.setpoint_uA]
    """)
    assert found == [OUT_OF_SEQUENCE, 500_000]


@pytest.mark.parametrize("mode", [2, 3, 4])
def test_modes_that_come_later_are_refused_by_name(mode: int) -> None:
    refusal = on_board(f"""
        session = Session()
        session.take_control()
        found = session.refusal(wire.SET_POINT, struct.pack(wire.SET_POINT_FORMAT, {mode}, 1000))
    """)
    assert refusal == [NOT_OFFERED, 0, mode]


def test_a_set_point_beyond_the_limit_names_the_largest_that_fits() -> None:
    found = on_board("""
        session = Session()
        session.take_control()
        point = lambda uA: struct.pack(wire.SET_POINT_FORMAT, wire.MODE_CURRENT, uA)
        found = [session.refusal(wire.SET_POINT, point(4_000_001)), session.refusal(wire.SET_POINT, point(-1)),
                 session.refusal(wire.SET_POINT, point(4_000_000)), session.firmware.control.setpoint_uA]
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
        on = bytes([wire.SILENCE_STOP])
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


def test_going_on_alone_is_refused_as_long_as_the_board_has_no_ends() -> None:
    refusal = on_board("""
        session = Session()
        session.take_control()
        session.ask(wire.SET_POINT, struct.pack(wire.SET_POINT_FORMAT, wire.MODE_CURRENT, 1_000_000))
        found = session.refusal(wire.ENABLE, bytes([wire.SILENCE_CONTINUE]))
    """)
    assert refusal == [NOT_OFFERED, 0, 1]


def test_unknown_commands_wrong_lengths_and_wrong_versions_are_refused() -> None:
    found = on_board("""
        session = Session()
        session.take_control()
        found = [session.refusal(0x3E), session.refusal(wire.SET_POINT, b"123"), session.refusal(wire.BEAT, version=2)]
    """)
    assert found == [[UNKNOWN_COMMAND, 0, 0x3E], [BAD_LENGTH, 0, 5], [WRONG_VERSION, 0, 1]]


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


def test_a_frame_whose_length_field_lies_is_not_obeyed() -> None:
    released = on_board("""
        session = Session()
        session.sink(1_000_000)
        session._queue.append(struct.pack(wire.HEADER_FORMAT, wire.VERSION, wire.SET_POINT, 1, 99, 4) + bytes(5))
        session.turns(2)
        found = session.firmware.control.setpoint_uA
    """)
    assert released == 1_000_000
