"""The one file that touches the microcontroller, on stand-ins that refuse what the port's documentation does not allow.

The stand-ins are in stand_in_machine/, each naming the part of MicroPython's documentation that it follows.
"""

from __future__ import annotations

import json
from pathlib import Path

import pytest

from sinkwright.board_image import compile_board
from sinkwright.definitions import load_board
from tests.firmware.running import on_rp2_board


def test_the_gate_is_clamped_before_anything_else_is_touched() -> None:
    made = on_rp2_board("""
        board.Board(IMAGE)
        found = machine.made
    """)
    assert made[0] == ["Pin", 15, 1, 0]
    assert [entry[1] for entry in made if entry[0] == "Pin"] == [15, 16, 17, 5, 4]


def test_the_bus_is_made_with_the_image_s_pins_and_frequency_and_a_time_out_below_the_period() -> None:
    made = on_rp2_board("""
        board.Board(IMAGE)
        found = [entry for entry in machine.made if entry[0] == "I2C"]
    """)
    assert made == [["I2C", 0, 5, 4, 400_000, 2_000]]


def test_a_held_bus_costs_its_time_out_and_less_than_a_period() -> None:
    found = on_rp2_board("""
        it = board.Board(IMAGE)
        it.bus.present = (0x48, 0x60)
        it.bus.held = True
        before = time.ticks_us()
        try:
            it.bus.writeto(0x60, b"ab")
        except OSError as error:
            found = [error.errno, it.clock.since(before)]
    """)
    errno, took_us = found
    assert errno == 110
    assert 2_000 <= took_us < 2_350


def test_the_longest_transfer_of_a_step_ends_before_the_time_out_on_the_slowest_bus() -> None:
    """50 kHz is the slowest bus that a board file may name; the chips' true drivers do the transfers."""
    longest_us = on_rp2_board("""
        from chips.adc_ads1115 import ADS1115
        from chips.dac_mcp4725 import MCP4725
        IMAGE["i2c"]["frequency_Hz"] = 50_000
        it = board.Board(IMAGE)
        it.bus.present = (0x48, 0x60)
        transfer = it.bus._transfer
        found = 0
        def timed(address, octets):
            global found
            before = time.ticks_us()
            transfer(address, octets)
            found = max(found, it.clock.since(before))
        it.bus._transfer = timed
        adc = ADS1115(it.bus, IMAGE["adc"])
        adc.begin(0)
        adc.finish()
        MCP4725(it.bus, IMAGE["dac"]).write(0)
    """)
    assert 0 < longest_us < 2_000


def test_reading_takes_what_is_there_and_no_more_than_the_buffer_holds() -> None:
    found = on_rp2_board("""
        stream = board.Board(IMAGE).stream
        buffer = bytearray(4)
        found = [stream.read_into(buffer)]
        port.stdin.buffer.waiting = b"abcdefg"
        for _ in range(3):
            count = stream.read_into(buffer)
            found.append(bytes(buffer[:count]).decode())
    """)
    assert found == [0, "abcd", "efg", ""]


def test_what_is_written_leaves_in_order_across_the_ring_s_wrap() -> None:
    found = on_rp2_board("""
        stream = board.Board(IMAGE).stream
        written = b""
        out = port.stdout.buffer
        for number in range(40):
            frame = bytes((number + at) & 0xFF for at in range(97))
            if stream.room() >= len(frame):
                assert stream.write(memoryview(frame)) == len(frame)
                written += frame
            out.space = 256
            for _ in range(61):
                stream.pump()
        out.space = 10_000
        while stream.room() < 512:
            stream.pump()
        found = [out.sent == written, len(written)]
    """)
    assert found[0] is True
    assert found[1] > 4 * 512


def test_a_port_that_nobody_reads_is_never_waited_for_and_the_room_says_so() -> None:
    found = on_rp2_board("""
        stream = board.Board(IMAGE).stream
        out = port.stdout.buffer
        out.space = 3
        found = [stream.room()]
        stream.write(b"x" * 100)
        found.append(stream.room())
        for _ in range(50):
            stream.pump()
        found += [stream.room(), len(out.sent)]
        stream.write(b"y" * stream.room())
        found.append(stream.room())
        stream.pump()
        found.append(stream.room())
    """)
    assert found == [512, 412, 415, 3, 0, 0]


def test_octets_leave_while_a_step_is_waited_for() -> None:
    found = on_rp2_board("""
        it = board.Board(IMAGE)
        it.stream.write(b"frame")
        it.clock.wait_until(it.clock.add(it.clock.ticks_us(), 2350))
        found = port.stdout.buffer.sent.decode()
    """)
    assert found == "frame"


def test_the_clock_goes_on_where_the_ticks_wrap() -> None:
    found = on_rp2_board("""
        clock = board.Board(IMAGE).clock
        time.set_us((1 << 30) - 1000)
        start = clock.ticks_us()
        deadline = clock.add(start, 2350)
        clock.wait_until(deadline)
        found = [deadline < start, clock.since(start), clock.since(deadline)]
    """)
    wrapped, since_start_us, late_us = found
    assert wrapped
    assert 2350 <= since_start_us < 2360
    assert 0 <= late_us < 10


def test_a_deadline_that_has_passed_is_not_waited_for() -> None:
    waited_us = on_rp2_board("""
        clock = board.Board(IMAGE).clock
        before = clock.ticks_us()
        clock.wait_until(clock.add(before, -5000))
        found = clock.since(before)
    """)
    assert waited_us < 10


def test_the_default_board_s_file_is_read_and_suits_the_microcontroller(tmp_path: Path) -> None:
    """The host compiles its default board; board.json is then read from the folder where the firmware lies."""
    image = compile_board(load_board())
    (tmp_path / "board.json").write_text(json.dumps(image))
    found = on_rp2_board(f"""
        import os
        os.chdir({str(tmp_path)!r})
        it = board.open_board()
        found = [it.image, it.simulated, len(it.board_id), 0 <= it.boot_number < 1 << 32, it.interpreter]
    """)
    assert found[0] == image
    assert found[1:4] == [False, 8, True]
    assert found[4].startswith("MicroPython 1.")


def test_the_gate_and_the_lights_follow_the_state_without_touching_the_heap() -> None:
    """The guard trips within the control step: what shows it may not allocate."""
    found = on_rp2_board("""
        it = board.Board(IMAGE)
        levels = bytearray(16)
        def show(at, state):
            it.led.show(state)
            levels[at] = it.led._red.level
            levels[at + 1] = it.led._green.level
        micropython.heap_lock()
        show(0, wire.STATE_OFF)
        show(2, wire.STATE_SINKING)
        show(4, wire.STATE_ENDED)
        show(6, wire.STATE_FAULT)
        it.gate.release()
        levels[8] = it.gate._pin.level
        it.gate.clamp()
        levels[9] = it.gate._pin.level
        micropython.heap_unlock()
        found = list(levels[:10])
    """)
    red_green = list(zip(found[0:8:2], found[1:8:2], strict=True))
    assert red_green == [(0, 1), (1, 0), (0, 1), (1, 1)]  # off, sinking, ended, fault
    assert found[8:] == [1, 0]


@pytest.mark.parametrize(("cause", "expected"), [("PWRON_RESET", 1), ("WDT_RESET", 2)])
def test_the_reset_cause_is_told(cause: str, expected: int) -> None:
    found = on_rp2_board(f"""
        machine.cause = machine.{cause}
        found = board.Board(IMAGE).reset_cause
    """)
    assert found == expected


def test_the_whole_firmware_on_a_board_without_converters_faults_and_stays_clamped() -> None:
    found = on_rp2_board("""
        import main
        it = board.Board(IMAGE)
        firmware = main.Firmware(it)
        for _ in range(8):
            firmware.turn()
        found = [firmware.machine.state, firmware.guard.fault, firmware.guard.value, it.gate._pin.level]
    """)
    assert found == [3, 8, 5, 0]  # FAULT, ADC_SILENT, EIO


REFUSED = {
    "a pin that the part has not": "machine.Pin(30)",
    "an output of unknown level": "machine.Pin(15, machine.Pin.OUT)",
    "an unknown keyword": "machine.Pin(15, machine.Pin.OUT, level=0)",
    "a value for an input": "machine.Pin(15, machine.Pin.IN, value=0)",
    "the clock on a data pin": "machine.I2C(0, scl=machine.Pin(4), sda=machine.Pin(5))",
    "the pins of the other bus": "machine.I2C(1, scl=machine.Pin(5), sda=machine.Pin(4))",
    "a frequency beyond the part": "machine.I2C(0, scl=machine.Pin(5), sda=machine.Pin(4), freq=3_400_000)",
    "a time-out of nothing": "machine.I2C(0, scl=machine.Pin(5), sda=machine.Pin(4), timeout=0)",
    "a read of more than is there": "port.stdin.buffer.readinto(bytearray(1))",
    "a poll that waits": "board.Stream()._poll.ipoll()",
    "a poll that makes a list": "board.Stream()._poll.poll(0)",
    "ticks that were added without ticks_add": "time.ticks_diff(1 << 30, 5)",
}


@pytest.mark.parametrize("name", REFUSED)
def test_the_stand_in_refuses(name: str) -> None:
    """The stand-in itself is checked: each of these raises."""
    found = on_rp2_board(f"""
        try:
            {REFUSED[name]}
            found = None
        except (ValueError, TypeError, AttributeError, WouldBlock) as error:
            found = repr(error)
    """)
    assert found is not None
