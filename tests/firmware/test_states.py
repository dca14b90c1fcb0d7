"""The state table under MicroPython: the gate is released in one state only."""

from __future__ import annotations

from tests.firmware.running import on_board


def test_the_gate_is_clamped_before_anything_else_happens() -> None:
    found = on_board("""
        board = Board()
        import states
        states.Machine(board.gate, board.led)
        found = [board.gate.released, board.led.state]
    """)
    assert found == [False, 0]


def test_only_sinking_releases_the_gate_whatever_the_event() -> None:
    table = on_board("""
        import states
        found = []
        for state in range(4):
            for event in range(5):
                board = Board()
                machine = states.Machine(board.gate, board.led)
                machine.state = state
                machine.fire(event)
                found.append([state, event, machine.state, board.gate.released])
    """)
    for _, _, after, released in table:
        assert released == (after == 1)


def test_nothing_but_clearing_leaves_a_fault() -> None:
    after = on_board("""
        import states
        found = []
        for event in (states.ENABLE, states.DISABLE, states.TRIP, states.CLEAR, states.END):
            board = Board()
            machine = states.Machine(board.gate, board.led)
            machine.fire(states.TRIP)
            machine.fire(event)
            found.append(machine.state)
    """)
    assert after == [3, 3, 3, 0, 3]


def test_a_trip_ends_in_fault_from_everywhere() -> None:
    after = on_board("""
        import states
        found = []
        for state in range(4):
            board = Board()
            machine = states.Machine(board.gate, board.led)
            machine.state = state
            machine.fire(states.TRIP)
            found.append(machine.state)
    """)
    assert after == [3, 3, 3, 3]


def test_a_held_gate_is_released_by_nothing_but_the_return_of_the_source() -> None:
    """Also not by clearing or enabling while it sinks from nothing; and off forgets that it was held."""
    found = on_board("""
        import states
        board = Board()
        machine = states.Machine(board.gate, board.led)
        machine.fire(states.ENABLE)
        machine.hold()
        found = [[machine.state, board.gate.released]]
        for event in (states.ENABLE, states.CLEAR):
            machine.fire(event)
            found.append(board.gate.released)
        machine.rearm()
        found.append(board.gate.released)
        machine.hold()
        machine.fire(states.DISABLE)
        machine.rearm()
        found.append([machine.state, machine.held, board.gate.released])
    """)
    assert found == [[1, False], False, False, True, [0, False, False]]
