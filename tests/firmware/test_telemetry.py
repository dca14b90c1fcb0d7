"""What the board says by itself: numbered, at the asked rate, dropped and counted rather than waited for."""

from __future__ import annotations

import pytest

from tests.firmware.running import on_board

KEEP = """
    session = Session()
    session.sink(1_000_000)
    session.ask(wire.SET_TELEMETRY, struct.pack(wire.SET_TELEMETRY_FORMAT, 42))
    frames = []
    open_line = True
    def keep(message, to, number, payload):
        if open_line and message == wire.TELEMETRY:
            frames.append(list(struct.unpack(wire.TELEMETRY_FORMAT, payload)))
        return open_line
    session.firmware.link.send = keep
"""


def test_frames_come_at_the_asked_number_of_steps_with_the_means_of_their_window() -> None:
    frames = on_board(
        KEEP
        + """
    session.turns(420)
    found = frames
"""
    )
    assert len(frames) == 10
    assert [frame[0] for frame in frames] == list(range(frames[0][0], frames[0][0] + 10))
    times = [frame[1] for frame in frames]
    assert {later - earlier for earlier, later in zip(times, times[1:], strict=False)} == {42 * 2350}
    assert frames[3][7] == pytest.approx(12e6, abs=1375)
    assert frames[3][10] == pytest.approx(1e6, abs=200)
    assert sum(frame[18] for frame in frames) == pytest.approx(420 * 32 / 66, abs=2)


def test_a_frame_that_finds_no_room_is_dropped_counted_and_missed_in_the_numbers() -> None:
    frames = on_board(
        KEEP
        + """
    session.turns(84)
    open_line = False
    session.turns(84)
    open_line = True
    session.turns(84)
    found = frames
"""
    )
    numbers = [frame[0] for frame in frames]
    assert numbers[2] - numbers[1] == 3
    assert frames[-1][20] - frames[0][20] == 2


def test_events_wait_for_room_and_come_in_order() -> None:
    found = on_board("""
        session = Session()
        session.sink(1_000_000)
        events = []
        open_line = False
        def keep(message, to, number, payload):
            if open_line and message == wire.EVENT:
                events.append(list(struct.unpack(wire.EVENT_FORMAT, payload)))
            return open_line
        session.firmware.link.send = keep
        session.board.show(1_000_000, 31_000_000)
        session.turns(5)
        open_line = True
        session.turns(2)
        found = events
    """)
    assert [event[2:4] for event in found] == [[4, 4]]
    assert found[0][5] == 30_000_000
