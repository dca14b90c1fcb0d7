"""Bursts: every conversion around a trigger, each at its own time, nothing lost."""

from __future__ import annotations

import pytest

from tests.firmware.running import on_32_bit_board, on_board

BURST = """
    def arm(session, before, trigger):
        return session.refusal(wire.ARM_BURST, struct.pack(wire.ARM_BURST_FORMAT, before, trigger))

    def fetch(session):
        '''[total, before, started_us, step_us], and all readings as [kind, value].'''
        readings = []
        while True:
            content = session.ask(wire.GET_BURST, struct.pack(wire.GET_BURST_FORMAT, len(readings)))[1]
            size = struct.calcsize(wire.BURST_READINGS_FORMAT)
            first, *head = struct.unpack_from(wire.BURST_READINGS_FORMAT, content)
            assert first == len(readings)
            step = struct.calcsize(wire.BURST_READING_FORMAT)
            for at in range(size, len(content), step):
                readings.append(list(struct.unpack_from(wire.BURST_READING_FORMAT, content, at)))
            if len(readings) >= head[0]:
                return head, readings

    def pass_turns(session, count):
        for _ in range(count):
            session.firmware.guard.quiet_steps = 0
            session.turns(1)

    session = Session()
    session.sink(1_000_000)
    firmware = session.firmware
    board = session.board
"""
SIZE = 2048
PERIOD_us = 2350


def test_a_load_step_is_captured_with_what_came_before_and_nothing_is_lost() -> None:
    head, readings, trigger_us, conversions = on_board(
        BURST
        + """
    begins = []
    begin = firmware.control._adc.begin
    def keep(number):
        begins.append([board.clock.now, number])
        begin(number)
    firmware.control._adc.begin = keep
    arm(session, 100, wire.BURST_TRIGGER_SETPOINT_CHANGE)
    pass_turns(session, 300)
    session.ask(wire.SET_POINT, struct.pack(wire.SET_POINT_FORMAT, wire.MODE_CURRENT, 3_000_000))
    trigger_us = board.clock.now + 2350
    pass_turns(session, 2100)
    head, readings = fetch(session)
    found = [head, readings, trigger_us, begins]
"""
    )
    total, before, started_us, step_us = head
    assert (total, before, step_us) == (SIZE, 100, PERIOD_us)
    assert started_us + before * step_us == trigger_us
    assert len(readings) == SIZE
    # Each reading is of the input whose conversion began at that reading's time.
    input_of = {0: 1, 1: 0, 2: 3, 3: 2}
    began = dict(conversions)
    for number, (kind, _) in enumerate(readings):
        assert began[started_us + number * step_us] == input_of[kind]
    currents = {number: value for number, (kind, value) in enumerate(readings) if kind == 1}
    before_it = [value for number, value in currents.items() if number < before]
    after_it = [value for number, value in currents.items() if number >= before + 4]
    assert before_it == pytest.approx([1e6] * len(before_it), abs=2000)
    assert after_it == pytest.approx([3e6] * len(after_it), abs=2000)


def test_now_begins_with_the_next_conversion() -> None:
    head, began, kinds = on_board(
        BURST
        + """
    arm(session, 0, wire.BURST_TRIGGER_NOW)
    began = board.clock.now + 2350
    pass_turns(session, 2060)
    head, readings = fetch(session)
    found = [head, began, sorted(set(kind for kind, _ in readings))]
"""
    )
    assert head == [SIZE, 0, began, PERIOD_us]
    assert kinds == [0, 1, 2, 3]


def test_a_fault_shows_what_led_to_it() -> None:
    head, peak, fault = on_board(
        BURST
        + """
    arm(session, 500, wire.BURST_TRIGGER_FAULT)
    pass_turns(session, 600)
    for number in range(6):
        board.show(1_000_000 + 200_000 * number, 12_000_000)
        pass_turns(session, 2)
    board.show(0, 12_000_000)
    pass_turns(session, 2100)
    head, readings = fetch(session)
    found = [head, max(value for kind, value in readings[:500] if kind == 1), firmware.guard.fault]
"""
    )
    assert head[:2] == [SIZE, 500]
    assert fault == 13
    assert peak >= 1_200_000


def test_a_fault_that_is_cleared_is_no_trigger() -> None:
    found = on_board(
        BURST
        + """
    board.show(2_000_000, 12_000_000)
    session.turns(4)
    board.show(0, 12_000_000)
    session.turns(20)
    arm(session, 0, wire.BURST_TRIGGER_FAULT)
    session.turns(2)
    refusal = session.refusal(wire.CLEAR_FAULT)
    session.turns(2100)
    found = [refusal, fetch(session)[0][0], firmware.burst.recording]
"""
    )
    assert found == [None, 0, True]


@pytest.mark.parametrize("command", ["DISABLE", "ENABLE"])
def test_turning_off_and_on_counts_as_a_change_of_the_set_point(command: str) -> None:
    found = on_board(
        BURST
        + f"""
    enable = struct.pack(wire.ENABLE_FORMAT, wire.SILENCE_STOP, 0, 0)
    if wire.{command} == wire.ENABLE:
        session.ask(wire.DISABLE)
        board.show(0, 12_000_000)
        session.turns(300)
    arm(session, 10, wire.BURST_TRIGGER_SETPOINT_CHANGE)
    pass_turns(session, 20)
    waiting = firmware.burst._left
    session.ask(wire.{command}, enable if wire.{command} == wire.ENABLE else b"")
    pass_turns(session, 2100)
    found = [waiting, fetch(session)[0][:2]]
"""
    )
    assert found == [-1, [SIZE, 10]]


def test_fewer_readings_than_asked_for_before_the_trigger_are_told_as_what_they_are() -> None:
    head, readings = on_board(
        BURST
        + """
    arm(session, 1000, wire.BURST_TRIGGER_SETPOINT_CHANGE)
    pass_turns(session, 40)
    session.ask(wire.SET_POINT, struct.pack(wire.SET_POINT_FORMAT, wire.MODE_CURRENT, 2_000_000))
    pass_turns(session, 1100)
    found = fetch(session)
"""
    )
    total, before = head[:2]
    assert before == 42  # with the turns in which the commands came
    assert total == len(readings) == before + SIZE - 1000


def test_a_step_without_a_conversion_keeps_its_slot() -> None:
    readings = on_board(
        BURST
        + """
    arm(session, 0, wire.BURST_TRIGGER_NOW)
    pass_turns(session, 50)
    board.bus.ready = False
    pass_turns(session, 3)
    board.bus.ready = True
    pass_turns(session, 2100)
    found = fetch(session)[1]
"""
    )
    assert len(readings) == SIZE
    assert [kind for kind, _ in readings].count(4) == 3
    assert [number for number, (kind, _) in enumerate(readings) if kind == 4] == [49, 50, 51]


def test_an_unfinished_capture_has_no_readings_and_a_new_one_gives_up_the_old() -> None:
    found = on_board(
        BURST
        + """
    empty = fetch(session)
    arm(session, 0, wire.BURST_TRIGGER_NOW)
    pass_turns(session, 2060)
    whole = fetch(session)[0][0]
    arm(session, 0, wire.BURST_TRIGGER_FAULT)
    found = [empty, whole, fetch(session)]
"""
    )
    assert found[0] == [[0, 0, 0, PERIOD_us], []]
    assert found[1] == SIZE
    assert found[2][0][0] == 0
    assert found[2][1] == []


def test_what_cannot_be_kept_is_refused() -> None:
    found = on_board(
        BURST
        + """
    found = [arm(session, 2048, wire.BURST_TRIGGER_NOW), arm(session, 0, 3), firmware.burst.recording]
"""
    )
    assert found == [[21, 0, 2047], [3, 0, 3], False]


RECORDING = (
    BURST
    + """
    arm(session, 50, wire.BURST_TRIGGER_SETPOINT_CHANGE)
    firmware.guard.quiet_steps = -10000
    wait, step = firmware.time.wait, firmware.control.step
    wait(); step()
    gc.collect()
    _ = 0
    total = {figure}
    total = {figure}
    micropython.heap_lock()
    for _ in range(60):
        wait()
        step()
    firmware.control.setpoint = 1_000_100
    for _ in range(2100):
        wait()
        step()
    micropython.heap_unlock()
    found = [{figure} - total, firmware.burst.total, firmware.guard.fault]
"""
)


def test_capturing_allocates_nothing() -> None:
    assert on_board(RECORDING.format(figure="micropython.mem_total()")) == [0, SIZE, 0]


def test_capturing_allocates_nothing_where_small_integers_have_31_bits() -> None:
    assert on_32_bit_board(RECORDING.format(figure="gc.mem_alloc()")) == [0, SIZE, 0]
