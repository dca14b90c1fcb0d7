"""The loop as a whole: frames in and out, and the gate clamped however it is left."""

from __future__ import annotations

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


@pytest.mark.parametrize("leaving", ["KeyboardInterrupt", "ValueError", "MemoryError", "SystemExit"])
def test_however_the_loop_is_left_the_gate_is_clamped(leaving: str) -> None:
    found = on_board(f"""
        import main
        board = Board()
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
        found = [left, board.gate.released]
    """)
    assert found == ["raised", False]


def test_a_part_missing_from_the_image_leaves_the_gate_clamped() -> None:
    found = on_board("""
        import main
        board = Board()
        board.gate.release()
        del board.image["scales"]
        try:
            main.run(board)
        except KeyError as error:
            found = [str(error), board.gate.released]
    """)
    assert found == ["scales", False]


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
