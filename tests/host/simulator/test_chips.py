"""The simulated chips at register level, against their datasheets; run by MicroPython."""

from __future__ import annotations

from .board_side import check

WORLD = 'world = World({"kind": "supply", "voltage_V": 10.0, "resistance_ohm": 0.1})\nword = bytearray(2)\n'


def test_the_converter_wakes_with_its_reset_value_and_keeps_what_is_written() -> None:
    """Source: SBAS444, config register reset 8583h; thresholds 8000h and 7FFFh."""
    check(
        WORLD
        + """
seen = []
for register in (1, 2, 3):
    world.bus.readfrom_mem_into(0x48, register, word)
    seen.append(bytes(word))
assert seen == [b"\\x85\\x83", b"\\x80\\x00", b"\\x7f\\xff"], seen
world.bus.writeto_mem(0x48, 3, b"\\x12\\x34")
world.bus.readfrom_mem_into(0x48, 3, word)
assert bytes(word) == b"\\x12\\x34"
"""
    )


def test_the_ready_flag_falls_for_the_time_of_one_conversion() -> None:
    """Source: SBAS444: OS reads 0 while converting; 860 conversions a second take 1.163 ms, here 10 %
    more.
    """
    check("""
base = plant()
base["adc"]["window"] = 1.1
world = World({"kind": "supply", "voltage_V": 10.0, "resistance_ohm": 0.1}, adc=base["adc"])
word = bytearray(2)
world.begin(1)
began = world.plant.now
world.bus.readfrom_mem_into(0x48, 1, word)
assert bytes(word) == b"\\x53\\xe3", word
while not word[0] & 0x80:
    world.run_s(10e-6)
    world.bus.readfrom_mem_into(0x48, 1, word)
assert bytes(word) == b"\\xd3\\xe3", word
near(world.plant.now - began, 1279, 250)
""")


def test_a_conversion_under_way_is_neither_restarted_nor_shown() -> None:
    check(
        WORLD
        + """
first = world.convert(1)
world.begin(3)
world.begin(0)  # starts nothing
world.bus.readfrom_mem_into(0x48, 0, word)
assert (word[0] << 8 | word[1]) == first
assert world.finish() == world.convert(3) != first
"""
    )


def test_gain_stage_and_multiplexer_choose_scale_and_input() -> None:
    """Source: SBAS444, full-scale ranges: 187.5, 125, 62.5, 31.25 ... uV a count; MUX 000 to 011 are
    differences.
    """
    check(
        WORLD
        + """
pin_V = 0.1 + 10.0 / 11.0
for field, uV in ((0, 187.5), (1, 125.0), (2, 62.5), (3, 31.25)):
    near(world.convert(1, gain_bits=field), pin_V / (uV * 1e-6), 0.6)
assert world.convert(1, gain_bits=4) == 32767  # 0.512 V full scale
world.bus.writeto_mem(0x48, 1, bytes([0x83, 0xE3]))  # AIN0 - AIN1
near(world.finish(), (0.1 - pin_V) / 125e-6, 0.6)
"""
    )


def test_a_slower_data_rate_takes_longer() -> None:
    check(
        WORLD
        + """
world.begin(1, rate_bits=4)
world.run_s(0.0075)
world.bus.readfrom_mem_into(0x48, 1, word)
assert not word[0] & 0x80
world.run_s(0.0005)
world.bus.readfrom_mem_into(0x48, 1, word)
assert word[0] & 0x80
"""
    )


def test_a_change_within_the_window_is_weighed_by_its_share() -> None:
    """Source: a mean over the window; the gate closes in the middle of it."""
    check(
        WORLD
        + """
true_A = world.sink(2.0)
world.run_s(0.1)
world.begin(0)
world.run_s(0.0005)
world.board.gate.clamp()
near((world.finish() * 125e-6 - 0.1) / 0.625, true_A * 500 / 1163, 5e-3)
"""
    )


def test_continuous_conversion_follows_by_itself() -> None:
    check(
        WORLD
        + """
world.bus.writeto_mem(0x48, 1, bytes([0x42, 0xE3]))
near(world.finish(), 0.1 / 125e-6, 1)
true_A = world.sink(1.0)
world.run_s(0.05)
world.finish()
near((world.finish() * 125e-6 - 0.1) / 0.625, true_A, 4e-4)
"""
    )


def test_noise_is_gaussian_of_the_given_size_and_never_the_same_for_two_seeds() -> None:
    """Source: a normal distribution has 68.27 % within one standard deviation; here of 3 counts."""
    check("""
from noise import Noise
drawn = Noise(7, 3.0 * 65536)
values = [drawn.draw() / 65536 for _ in range(20000)]
near(sum(values) / 20000, 0.0, 0.1)
near(math.sqrt(sum([v * v for v in values]) / 20000), 3.0, 0.1)
near(sum([1 for v in values if abs(v) < 3.0]) / 20000, 0.6827, 0.015)
again = Noise(7, 3.0 * 65536)
other = Noise(8, 3.0 * 65536)
assert [again.draw() / 65536 for _ in range(50)] == values[:50] != [other.draw() / 65536 for _ in range(50)]
""")


def test_a_chip_that_does_not_answer_is_an_oserror() -> None:
    check("""
world = World({"kind": "supply", "voltage_V": 10.0, "resistance_ohm": 0.1}, defects=[
    {"kind": "adc_silent", "from_us": 5000, "until_us": 9000}, {"kind": "dac_silent", "from_us": 20000}])
def answers(call):
    try:
        call()
    except OSError as error:
        assert error.errno == 5
        return False
    return True
word = bytearray(2)
read = lambda: world.bus.readfrom_mem_into(0x48, 0, word)
write = lambda: world.bus.writeto(0x60, b"\\x00\\x00")
assert answers(read) and answers(write)
world.run_s(0.006)
assert not answers(read) and answers(write)
world.run_s(0.010)
assert answers(read) and answers(write)
world.run_s(0.010)
assert answers(read) and not answers(write)
assert not answers(lambda: world.bus.writeto(0x11, b"\\x00"))
""")


def test_a_converter_whose_oscillator_stands_still_keeps_its_result_and_is_never_ready() -> None:
    """Source: SBAS444, config register: OS reads 0 while a conversion is under way."""
    check("""
world = World({"kind": "supply", "voltage_V": 10.0, "resistance_ohm": 0.1},
              defects=[{"kind": "adc_not_converting", "from_us": 50000}])
first = world.convert(1)
word = bytearray(2)
world.bus.readfrom_mem_into(0x48, 1, word)
assert word[0] & 0x80
world.run_s(0.1)
assert world.convert(3) == first
world.bus.readfrom_mem_into(0x48, 1, word)
assert not word[0] & 0x80
""")


def test_the_dac_takes_fast_and_long_writes_and_tells_what_it_holds() -> None:
    """Source: DS22039, figures 6-1 (fast), 6-2 (DAC register), 6-3 (read): 12 bits, reference * code /
    4096.
    """
    check(
        WORLD
        + """
five = bytearray(5)
world.bus.writeto(0x60, b"\\x08\\x00")
near(world.board.dac.output_V(), 1.65, 1e-9)
world.bus.writeto_mem(0x60, 0x40, b"\\xff\\xf0")
near(world.board.dac.output_V(), 3.3 * 4095 / 4096, 1e-9)
world.bus.readfrom_mem_into(0x60, 0, five)
assert bytes(five) == b"\\xc0\\xff\\xf0\\x00\\x00", five
world.bus.writeto(0x60, b"\\x18\\x00")  # power-down: 1 kohm to ground
near(world.board.dac.output_V(), 0.0, 0.0)
"""
    )


def test_the_dac_remembers_its_power_up_value_and_is_busy_meanwhile() -> None:
    """Source: DS22039, command 011; RDY/BSY low for the EEPROM's 25 ms (typical), commands ignored; general
    call 06h.
    """
    check(
        WORLD
        + """
five = bytearray(5)
world.bus.writeto_mem(0x60, 0x60, b"\\x12\\x30")
world.bus.readfrom_mem_into(0x60, 0, five)
assert not five[0] & 0x80
world.bus.writeto(0x60, b"\\x0f\\xff")
assert world.board.dac.code == 0x123
world.run_s(0.03)
world.bus.writeto(0x60, b"\\x0f\\xff")
assert world.board.dac.code == 0xFFF
world.bus.writeto(0, b"\\x06")
assert world.board.dac.code == 0x123
"""
    )


def test_the_nonlinearity_of_the_dac_is_straight_between_its_points() -> None:
    check("""
base = plant()
base["dac"]["inl"] = [[0, 0.0], [1024, 4.0], [4095, 0.0]]
world = World({"kind": "supply", "voltage_V": 10.0, "resistance_ohm": 0.1}, dac=base["dac"])
for code, counts in ((0, 0.0), (512, 2.0), (1024, 4.0), (2560, 4.0 * (4095 - 2560) / 3071)):
    world.bus.writeto(0x60, bytes([code >> 8, code & 0xFF]))
    near(world.board.dac.output_V(), 3.3 * (code + counts) / 4096, 1e-9)
""")


def test_a_stuck_bit_of_the_converter_is_one_in_every_result() -> None:
    check("""
world = World({"kind": "supply", "voltage_V": 12.0, "resistance_ohm": 0.1}, defects=[
    {"kind": "adc_bit_14", "from_us": 50000, "until_us": 100000}, {"kind": "adc_bit_15", "from_us": 150000}])
true = world.convert(1)
world.run_s(0.06)
assert world.convert(1) == true | 0x4000
world.run_s(0.1)
assert world.convert(1) == (true | 0x8000) - 0x10000
""")


def test_an_idle_converter_takes_its_orders_and_says_ready_but_begins_nothing() -> None:
    check("""
world = World({"kind": "supply", "voltage_V": 10.0, "resistance_ohm": 0.1},
              defects=[{"kind": "adc_idle", "from_us": 50000}])
first = world.convert(1)
world.run_s(0.1)
world.begin(3)
word = bytearray(2)
world.bus.readfrom_mem_into(0x48, 1, word)
assert word[0] & 0x80 and world.finish() == first
""")


def test_a_stuck_dac_keeps_its_output_and_a_dead_one_gives_none_while_the_registers_tell_what_was_written() -> (
    None
):
    check("""
world = World({"kind": "supply", "voltage_V": 10.0, "resistance_ohm": 0.1}, defects=[
    {"kind": "dac_stuck", "from_us": 50000, "until_us": 100000}, {"kind": "dac_dead", "from_us": 150000}])
world.bus.writeto(0x60, b"\\x08\\x00")
world.run_s(0.06)
world.bus.writeto(0x60, b"\\x04\\x00")
near(world.board.dac.output_V(), 1.65, 1e-9)
assert world.board.dac.code == 0x400
world.run_s(0.06)
near(world.board.dac.output_V(), 0.825, 1e-9)
world.run_s(0.06)
near(world.board.dac.output_V(), 0.0, 0.0)
""")


def test_on_a_bus_held_low_each_transaction_runs_into_its_time_out() -> None:
    """Source: board.py asks for 2 ms."""
    check("""
world = World({"kind": "supply", "voltage_V": 10.0, "resistance_ohm": 0.1},
              defects=[{"kind": "bus_stuck_low", "from_us": 50000, "until_us": 100000}])
world.run_s(0.06)
before = world.plant.now
try:
    world.bus.writeto(0x60, b"\\x08\\x00")
    assert False
except OSError as error:
    assert error.errno == 110
assert world.plant.now - before >= 2000
world.run_s(0.1)
world.bus.writeto(0x60, b"\\x08\\x00")
""")
