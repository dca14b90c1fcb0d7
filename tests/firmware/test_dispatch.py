"""The rules of the conversation on the board: who may give a command, once each, and what is refused."""

from __future__ import annotations

from tests.firmware.running import on_board

UNKNOWN_COMMAND, BAD_LENGTH, NOT_IN_CONTROL, OUT_OF_SEQUENCE, WRONG_VERSION = 1, 2, 9, 10, 16


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
        found = [status[0], refused, done[0], session.board.gate.released, session.firmware.control.setpoint]
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
        enable = struct.pack(wire.ENABLE_FORMAT, wire.SILENCE_STOP, 0, 0)
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
        found.append(session.firmware.control.setpoint)
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
        found = [session.refusal(wire.SET_POINT, point, sequence=2)[0], session.firmware.control.setpoint]
    """)
    assert found == [OUT_OF_SEQUENCE, 500_000]


def test_unknown_commands_wrong_lengths_and_wrong_versions_are_refused() -> None:
    found = on_board("""
        session = Session()
        session.take_control()
        found = [session.refusal(0x3E), session.refusal(wire.SET_POINT, b"123"), session.refusal(wire.BEAT, version=2)]
    """)
    assert found == [[UNKNOWN_COMMAND, 0, 0x3E], [BAD_LENGTH, 0, 5], [WRONG_VERSION, 0, 1]]


def test_a_frame_whose_length_field_lies_is_not_obeyed() -> None:
    released = on_board("""
        session = Session()
        session.sink(1_000_000)
        session._queue.append(struct.pack(wire.HEADER_FORMAT, wire.VERSION, wire.SET_POINT, 1, 99, 4) + bytes(5))
        session.turns(2)
        found = session.firmware.control.setpoint
    """)
    assert released == 1_000_000


def test_a_tail_of_half_an_entry_is_refused_and_a_tail_where_none_belongs() -> None:
    found = on_board("""
        session = Session()
        session.take_control()
        head = struct.pack(wire.LOAD_PROGRAM_FORMAT, 0, 1, 1)
        step = struct.pack(wire.PROGRAM_STEP_FORMAT, 1000, 0, 0, 0)
        found = [session.refusal(wire.LOAD_PROGRAM, head + step[:-1]), session.refusal(wire.BEAT, step),
                 session.refusal(wire.LOAD_PROGRAM, head + step)]
    """)
    assert found == [[BAD_LENGTH, 0, 4], [BAD_LENGTH, 0, 0], None]
