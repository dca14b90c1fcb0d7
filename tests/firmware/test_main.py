"""The loop as a whole: frames in and out, and the gate clamped however it is left."""

from __future__ import annotations

from typing import Any

import pytest

from tests.firmware.running import on_board


def test_a_hello_frame_is_answered_by_a_frame() -> None:
    found = on_board("""
        import binascii, main
        board = Board()
        firmware = main.Firmware(board)
        content = struct.pack(wire.HEADER_FORMAT, wire.VERSION, wire.HELLO, 0x1234, 1, 2) + bytes([wire.VERSION, 0])
        board.stream.incoming = b"~" + content + struct.pack("<I", binascii.crc32(content)) + b"~"
        for _ in range(3):
            firmware.turn()
        frames = [part for part in board.stream.outgoing.split(b"~") if part]
        found = [[frame[1], frame[2] | frame[3] << 8] for frame in frames]
    """)
    assert [0x81, 0x1234] in found


LEAVE = """
    import main
    board = Board()
    board.maintenance = {maintenance}
    turns = [0]
    def wait_until(ticks):
        turns[0] += 1
        if turns[0] == 50:
            board.gate.release()
        if turns[0] > 60:
            raise {leaving}
        board.clock.now = ticks
    board.clock.wait_until = wait_until
    try:
        main.run(board)
        left = "returned"
    except {leaving}:
        left = "raised"
    found = [left, board.gate.released, board.restarts]
"""


@pytest.mark.parametrize(
    ("leaving", "restarts"),
    [("KeyboardInterrupt", [[True, 3]]), ("ValueError", [[True, 4]]), ("MemoryError", [[True, 4]])],
)
def test_however_the_loop_is_left_the_gate_is_clamped_and_a_maintenance_boot_follows(
    leaving: str, restarts: list[Any]
) -> None:
    """The reset cause told to it is SOFT after Ctrl-C, EXCEPTION after an error."""
    assert on_board(LEAVE.format(leaving=leaving, maintenance=False)) == ["returned", False, restarts]


@pytest.mark.parametrize("leaving", ["KeyboardInterrupt", "ValueError"])
def test_leaving_the_loop_of_a_maintenance_boot_ends_at_the_prompt_and_not_in_an_endless_restart(
    leaving: str,
) -> None:
    assert on_board(LEAVE.format(leaving=leaving, maintenance=True)) == ["returned", False, []]


def test_whoever_ends_the_interpreter_finds_the_gate_clamped() -> None:
    assert on_board(LEAVE.format(leaving="SystemExit", maintenance=False)) == ["raised", False, []]


def test_a_part_missing_from_the_image_leaves_the_gate_clamped_and_is_told() -> None:
    found = on_board("""
        import main
        board = Board()
        board.gate.release()
        del board.image["scales"]
        turns = [0]
        def wait_until(ticks):
            turns[0] += 1
            board.clock.now = ticks
            if turns[0] > 60:
                raise SystemExit
        board.clock.wait_until = wait_until
        try:
            main.run(board)
        except SystemExit:
            found = [board.image["name"], board.gate.released]
    """)
    assert found == ["no board file", False]


def test_the_watchdog_runs_from_the_first_turn_but_not_in_a_maintenance_boot() -> None:
    for maintenance in (False, True):
        found = on_board(f"""
            import main
            board = Board()
            board.maintenance = {maintenance}
            fed = []
            def wait_until(ticks):
                fed.append(board.watchdog.started)
                board.clock.now = ticks
                if len(fed) > 100:
                    raise SystemExit
            board.clock.wait_until = wait_until
            try:
                main.run(board)
            except SystemExit:
                found = [fed[0], fed[-1]]
        """)
        assert found == [False, not maintenance]


def test_the_watchdog_is_fed_every_sixteen_turns_and_not_after_one_that_was_late() -> None:
    found = on_board("""
        session = Session()
        watchdog = session.board.watchdog
        session.turns(1)
        found = []
        for late_us in (0, 0, 5_000, 0, 60_000, 0):
            before = watchdog.fed
            session.board.clock.stall_us = late_us
            session.turns(16)
            found.append(watchdog.fed - before)
    """)
    assert found == [1, 1, 0, 1, 0, 1]


def test_the_off_button_turns_off_is_told_once_and_holds_off() -> None:
    found = on_board("""
        session = Session()
        session.sink(1_000_000)
        found = [session.board.gate.released]
        del session.sent[:]
        session.board.pressed = True
        session.turns(1)
        found.append(session.board.gate.released)
        for bounce in (False, True, False, False, True):
            session.board.pressed = bounce
            session.turns(1)
        session.turns(20)
        kinds = [payload[12] for message, _, _, payload in session.sent if message == wire.EVENT]
        found += [kinds.count(wire.EVENT_BUTTON), kinds.count(wire.EVENT_DISABLED)]
        session.ask(wire.ENABLE, struct.pack(wire.ENABLE_FORMAT, wire.SILENCE_STOP, 0, 0))
        session.turns(2)
        found.append(session.board.gate.released)
        session.board.pressed = False
        session.turns(200)
        session.ask(wire.ENABLE, struct.pack(wire.ENABLE_FORMAT, wire.SILENCE_STOP, 0, 0))
        found.append(session.board.gate.released)
    """)
    assert found == [True, False, 1, 1, False, True]


def test_the_off_button_does_not_clear_a_fault() -> None:
    found = on_board("""
        session = Session()
        session.firmware.guard.latch(wire.FAULT_LOOP_LATE, 1, 1)
        session.board.pressed = True
        session.turns(3)
        found = session.firmware.machine.state
    """)
    assert found == 3


RESTARTING = """
    import startup
    session = Session()
    session.take_control()
    {arrange}
    found = [session.refusal(wire.RESTART, bytes([{maintenance}]))]
    try:
        session.turns(20)
        found.append("goes on")
    except startup.Restart as wanted:
        found.append(wanted.maintenance)
        startup.leave(session.board, wanted)
    found.append(session.board.restarts)
"""


@pytest.mark.parametrize("maintenance", [0, 1])
def test_a_host_may_restart_the_board_which_answers_first(maintenance: int) -> None:
    found = on_board(RESTARTING.format(arrange="pass", maintenance=maintenance))
    assert found == [None, maintenance, [[bool(maintenance), 3]]]


def test_a_restart_is_refused_while_the_load_is_on() -> None:
    found = on_board(RESTARTING.format(arrange="session.sink(100_000)", maintenance=0))
    assert found == [[11, 0, 0], "goes on", []]


def test_a_maintenance_boot_does_not_sink() -> None:
    found = on_board("""
        session = Session()
        session.board.maintenance = True
        session.take_control()
        session.ask(wire.SET_POINT, struct.pack(wire.SET_POINT_FORMAT, wire.MODE_CURRENT, 1000))
        enable = struct.pack(wire.ENABLE_FORMAT, wire.SILENCE_STOP, 0, 0)
        found = [session.refusal(wire.ENABLE, enable), session.board.gate.released]
    """)
    assert found == [[6, 0, 0], False]


@pytest.mark.parametrize("medium", ["works", "fails"])
def test_the_reason_of_a_crash_is_kept_for_whoever_asks_later_and_a_medium_that_fails_holds_nothing_up(
    medium: str,
) -> None:
    found = on_board(f"""
        import main, startup
        said = []
        startup.print = said.append
        board = Board()
        write = board.store.write
        def fails(slot, data):
            raise OSError(5)
        if {medium == "fails"}:
            board.store.write = fails
        startup.leave(board, ValueError("a made-up error"))
        board.reset_cause = wire.RESET_EXCEPTION
        board.store.write = write
        session = Session(board)
        session.ask(wire.IDENTIFY)
        lines = [payload[1:].decode() for message, _, _, payload in session.sent if message == wire.LOG_LINE]
        found = [board.restarts, lines]
    """)
    reason = "ValueError('a made-up error',)" if medium == "works" else "reason not kept"
    assert found == [[[True, 4]], [f"the firmware had stopped: {reason}"]]


def test_after_an_exception_the_next_start_says_so_and_stays_off_until_it_is_restarted() -> None:
    found = on_board("""
        import main, startup
        board = Board()
        board.maintenance = True
        board.reset_cause = wire.RESET_EXCEPTION
        firmware = startup.start(board, main.Firmware)
        found = [firmware.guard.fault, firmware.guard.clear(), firmware.self_test]
    """)
    assert found == [16, False, 0]


def test_a_port_that_nobody_reads_does_not_slow_the_loop() -> None:
    found = on_board("""
        import main
        board = Board()
        firmware = main.Firmware(board)
        firmware.telemetry.ask(4)
        board.stream.space = 0
        for _ in range(400):
            firmware.turn()
        found = [firmware.time.overruns, firmware.telemetry.dropped, board.stream.outgoing == b""]
    """)
    overruns, dropped, nothing_written = found
    assert overruns == 0
    assert dropped >= 95
    assert nothing_written
