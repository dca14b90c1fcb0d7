"""What the firmware meets in place of the real board.py: clock, stream, gate, identity."""

from __future__ import annotations

from pathlib import Path

from sinkwright.simulator.memory import FORMAT, take_out

from .board_side import check, check_under_cpython

GRANTS = """
import board

class Script:
    '''A pipe whose host grants what the list says; it keeps what it was answered.'''
    def __init__(self, grants):
        self.grants, self.answers, self.out, self.out_count = grants, [], b"", 0
    def put(self, data):
        self.out += bytes(data)
        self.out_count += len(data)
    def answer(self, now_us):
        self.answers.append((now_us, self.out))
        self.out, self.out_count = b"", 0
    def grant(self):
        if not self.grants:
            raise SystemExit(0)
        return self.grants.pop(0)

from nominal_board import IMAGE
def start(grants, **more):
    pipe = Script(grants)
    setup = {"image": IMAGE, "plant": plant(), "seed": 3, "board_id": "0011223344556677",
             "source": {"kind": "supply", "voltage_V": 12.0, "resistance_ohm": 0.1}}
    setup.update(more)
    board.install(setup, pipe)
    return board.open_board(), pipe
"""


def test_time_passes_only_as_far_as_the_host_has_granted() -> None:
    script = (
        GRANTS
        + """
made, pipe = start([(1000, b""), (1000, b""), (5000, b"")])
made.clock.wait_until(2350)
assert made.clock.ticks_us() == 2350
assert pipe.answers == [(1000, b""), (2000, b"")], pipe.answers
made.clock.wait_until(7000)
assert made.clock.ticks_us() == 7000 and len(pipe.answers) == 2
"""
    )
    check(script)
    check_under_cpython(script)


def test_what_was_written_leaves_at_the_next_wait_at_the_time_it_was_written() -> None:
    check(
        GRANTS
        + """
made, pipe = start([(100000, b""), (100000, b"")])
made.clock.wait_until(2350)
assert made.stream.room() == 256
assert made.stream.write(b"frame") == 5
assert made.stream.room() == 251
made.clock.wait_until(4700)
assert pipe.answers == [(2350, b"frame")], pipe.answers
assert made.stream.room() == 256
assert made.clock.since(2350) == 2350 and made.clock.add(4700, 2350) == 7050
"""
    )


def test_output_leaves_although_the_firmware_is_late() -> None:
    check(
        GRANTS
        + """
made, pipe = start([(100000, b""), (100000, b"")])
made.clock.wait_until(9000)
made.stream.write(b"late")
made.clock.wait_until(4700)
assert pipe.answers == [(9000, b"late")] and made.clock.ticks_us() == 9000
"""
    )


def test_a_full_stream_takes_no_more() -> None:
    check(
        GRANTS
        + """
made, pipe = start([(100000, b""), (100000, b"")])
assert made.stream.write(bytes(200)) == 200
assert made.stream.write(bytes(200)) == 56
assert made.stream.room() == 0 and made.stream.write(b"x") == 0
made.clock.wait_until(1)
assert len(pipe.answers[0][1]) == 256
"""
    )


def test_bytes_of_several_grants_are_read_in_pieces_and_in_order() -> None:
    check(
        GRANTS
        + """
made, pipe = start([(10, b"abcdef"), (10, b"ghi"), (1000, b"")])
buffer = bytearray(4)
made.clock.wait_until(15)
read = b""
while True:
    count = made.stream.read_into(buffer)
    if not count:
        break
    read += bytes(buffer[:count])
assert read == b"abcdefghi", read
"""
    )


def test_a_bus_transaction_takes_its_time_on_the_wire() -> None:
    """Source: nine bits a byte at 400 kHz, start and stop: two data bytes behind address and register are 38
    bits.
    """
    check(
        GRANTS
        + """
made, pipe = start([(100000, b"")])
made.bus.writeto_mem(0x48, 1, b"\\xc3\\xe3")
assert made.clock.ticks_us() == 95, made.clock.ticks_us()
made.bus.readfrom_mem_into(0x48, 1, bytearray(2))
assert made.clock.ticks_us() == 95 + 120, made.clock.ticks_us()
"""
    )


def test_the_board_says_who_it_is_and_that_it_is_simulated() -> None:
    check(
        GRANTS
        + """
made, pipe = start([(1, b"")])
assert made.simulated is True and made.reset_cause == 1 and made.maintenance is False
assert made.board_id == b"\\x00\\x11\\x22\\x33\\x44\\x55\\x66\\x77"
assert made.interpreter.startswith("MicroPython 1."), made.interpreter
assert len(made.interpreter) <= 32
made.led.show(3)
assert made.led.shown == 3
"""
    )


def test_a_watchdog_that_is_not_fed_resets_the_microcontroller_and_the_gate_is_clamped() -> None:
    """The real board.py asks for 2 s; before its start it does not run, and after a reset neither."""
    check(
        GRANTS
        + """
made, pipe = start([(1000000, b"")] * 30)
made.clock.wait_until(5000000)
made.watchdog.feed()
made.clock.wait_until(8000000)  # not started: it does not run
made.watchdog.start()
made.clock.wait_until(9500000)
made.watchdog.feed()
made.gate.release()
made.bus.writeto(0x60, b"\\x08\\x00")
fed_at = made.clock.ticks_us()
made.clock.wait_until(11000000)
try:
    made.clock.wait_until(20000000)
    assert False
except board.Reset:
    pass
assert abs(made.clock.since(fed_at) - 2000000) < 1000, made.clock.since(fed_at)
assert made.reset_cause == 2 and made.maintenance is False
made.start_again()
made.clock.wait_until(made.clock.add(made.clock.ticks_us(), 9000000))
assert made.plant.current_A == 0.0
assert made.dac.code == 0x800  # the chips were not reset
"""
    )


def test_a_restart_is_told_to_the_next_start_and_what_was_written_leaves_before_it() -> None:
    check(
        GRANTS
        + """
made, pipe = start([(50000, b"")] * 3 + [(50000, b"lost")] + [(50000, b"")] * 7)
made.stream.write(b"last words")
try:
    made.restart(True, 4)
    assert False
except board.Reset:
    pass
assert pipe.answers[0][1] == b"last words"
assert made.maintenance is True and made.reset_cause == 4
made.start_again()
assert made.stream.read_into(bytearray(9)) == 0
"""
    )


def test_ticks_wrap_at_2_to_the_30_and_time_goes_on() -> None:
    check(
        GRANTS
        + """
made, pipe = start([(1 << 31, b"")], first_ticks=(1 << 30) - 1000)
clock = made.clock
before = clock.ticks_us()
clock.wait_until(clock.add(before, 2350))
assert before == (1 << 30) - 1000 and clock.ticks_us() == 1350
assert clock.since(before) == 2350 and clock.since(clock.add(before, 4700)) == -2350
clock.wait_until(before)  # long past: not waited for
assert clock.ticks_us() == 1350
"""
    )


def test_the_store_of_a_board_with_a_memory_is_kept_whole_in_its_file(tmp_path: Path) -> None:
    memory = {
        "path": str(tmp_path / "m.json"),
        "format": FORMAT,
        "seed": 3,
        "starts": 5,
        "slots": ["", "0102"],
    }
    check(
        GRANTS
        + f"""
made, pipe = start([(1000, b"")], memory={memory!r})
assert made.store.read(0) == b"" and made.store.read(1) == bytes([1, 2])
made.store.write(0, b"abc")
assert made.store.read(0) == b"abc"
"""
    )
    assert [path.name for path in tmp_path.iterdir()] == ["m.json"]
    assert take_out(tmp_path / "m.json", 3).slots == ("616263", "0102")


def test_button_and_fan_are_what_a_test_says_and_sees() -> None:
    check(
        GRANTS
        + """
made, pipe = start([(1000, b"")])
assert made.button() is False
made.off_pressed = True
assert made.button() is True
made.fan(True)
assert made.fan_on is True
"""
    )


def test_a_step_at_rest_allocates_nothing_in_the_world() -> None:
    """The firmware's own proof (a step under a locked heap) can then be made on the simulated board too."""
    check(
        GRANTS
        + """
import gc
made, pipe = start([(1 << 31, b"")])
bus, clock, stream = made.bus, made.clock, made.stream
word, config, buffer = bytearray(2), b"\\xd1\\xe3", bytearray(64)
at = [2350 * k for k in range(1, 400)]
clock.wait_until(at[250])
gc.collect()
gc.disable()
least = 1 << 30
for k in range(251, 281):
    before = gc.mem_alloc()
    clock.wait_until(at[k])
    bus.readfrom_mem_into(0x48, 1, word)
    bus.readfrom_mem_into(0x48, 0, word)
    bus.writeto_mem(0x48, 1, config)
    stream.read_into(buffer)
    least = min(least, gc.mem_alloc() - before)
assert least == 0, least
"""
    )
