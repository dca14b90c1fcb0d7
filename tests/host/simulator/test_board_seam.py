"""What the firmware meets in place of the real board.py: clock, stream, gate, identity."""

from __future__ import annotations

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
def start(grants):
    pipe = Script(grants)
    setup = {"image": IMAGE, "plant": plant(), "seed": 3, "boot_number": 77, "board_id": "0011223344556677",
             "source": {"kind": "supply", "voltage_V": 12.0, "resistance_ohm": 0.1}}
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
assert made.simulated is True and made.boot_number == 77 and made.reset_cause == 1
assert made.board_id == b"\\x00\\x11\\x22\\x33\\x44\\x55\\x66\\x77"
assert made.interpreter.startswith("MicroPython 1."), made.interpreter
assert len(made.interpreter) <= 32
made.led.show(3)
assert made.led.shown == 3
"""
    )


def test_a_watchdog_that_was_fed_once_bites_when_it_is_not_fed_again() -> None:
    """Source: the RP2's watchdog waits 8.3 s at most."""
    check(
        GRANTS
        + """
made, pipe = start([(1000000, b"")] * 30)
made.clock.wait_until(20000000)  # never fed: it does not run
made.feed_watchdog()
try:
    made.clock.wait_until(31000000)
    assert False
except SystemExit as end:
    assert end.args[0] == 4
assert 28000000 <= made.clock.ticks_us() <= 30000000
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
