"""The run log covers a whole run in fixed memory, and hides no extreme."""

from __future__ import annotations

import pytest

from tests.firmware.running import on_board

DRIVE = """
    from meter import Meter
    from runlog import RunLog
    from timekeeper import Timekeeper
    board = Board()
    time = Timekeeper(board.clock, 2350)
    meter = Meter(2350)
    log = RunLog(meter, time, {capacity})
    log.begin()
    meter.restart()
    for second in range({seconds}):
        for _ in range(5):
            time.micros += 200_000
            if time.micros >= 1_000_000:
                time.micros -= 1_000_000
                time.seconds += 1
            meter.steps += 1
            meter.take_current(1_000_000)
            meter.take_voltage(12_000_000 - 1000 * second + (500_000 if second == {spike} else 0))
            log.service(True)
"""


def test_an_entry_a_second_until_the_log_is_full_and_then_twice_as_far_apart() -> None:
    found = on_board(
        DRIVE.format(capacity=64, seconds=300, spike=-1)
        + """
    for _ in range(9):
        log.service(False)
    found = [log.entries, log.spacing_ms, list(log.time_ms[:log.entries])]
"""
    )
    entries, spacing_ms, times = found
    assert spacing_ms == 8000
    assert 32 <= entries <= 64
    assert times[0] <= 8000
    assert times[-1] >= 299_000
    assert all(later - earlier <= 8000 for earlier, later in zip(times, times[1:], strict=False))
    assert times == sorted(times)


def test_merging_keeps_a_spike_of_one_conversion() -> None:
    highest = on_board(
        DRIVE.format(capacity=64, seconds=300, spike=30)
        + """
    for _ in range(9):
        log.service(False)
    found = max(log.voltage_max_uV[:log.entries])
"""
    )
    assert highest == pytest.approx(12_000_000 - 30_000 + 500_000, abs=1000)


def test_the_log_does_not_grow() -> None:
    grown = on_board(
        DRIVE.format(capacity=256, seconds=400, spike=-1)
        + """
    gc.collect()
    before = gc.mem_alloc()
    for _ in range(2000):
        time.seconds += 1
        meter.steps += 1
        meter.take_current(1_000_000)
        meter.take_voltage(12_000_000)
        log.service(True)
    gc.collect()
    found = gc.mem_alloc() - before
"""
    )
    assert grown <= 256


def test_a_run_that_ends_leaves_its_log_to_be_fetched() -> None:
    found = on_board("""
        session = Session()
        session.sink(1_000_000)
        for _ in range(30):
            session.firmware.guard.quiet_steps = 0
            session.turns(43)
        session.ask(wire.DISABLE)
        session.turns(40)
        reply = session.ask(wire.GET_LOG, struct.pack("<H", 0))
        first, total, spacing_ms = struct.unpack_from(wire.LOG_ENTRIES_FORMAT, reply[1])
        size = struct.calcsize(wire.LOG_ENTRY_FORMAT)
        tail = reply[1][struct.calcsize(wire.LOG_ENTRIES_FORMAT):]
        found = [total, spacing_ms, [list(struct.unpack_from(wire.LOG_ENTRY_FORMAT, tail, at))
                                     for at in range(0, len(tail), size)]]
    """)
    total, spacing_ms, entries = found
    assert (total, spacing_ms) == (len(entries), 1000)
    time_ms, voltage, lowest, highest, current, heatsink_cC, charge_mC = entries[1]
    assert time_ms == pytest.approx(2000, abs=40)
    assert lowest <= voltage <= highest
    assert current == pytest.approx(1e6, abs=300)
    assert heatsink_cC == 2500
    assert charge_mC == pytest.approx(2000, abs=90)
