"""The simulated monitor and the microcontroller's own converters, against their datasheets and without any driver."""

from __future__ import annotations

from .board_side import check, check_under_cpython

MONITOR = """
monitor = {"address": 0x40, "pin": 21, "shunt_ohm": 0.01}
world = World({"kind": "supply", "voltage_V": 10.0, "resistance_ohm": 0.1}, monitor=monitor)
word = bytearray(2)
def read(register):
    world.bus.readfrom_mem_into(0x40, register, word)
    return word[0] << 8 | word[1]
def write(register, value):
    world.bus.writeto_mem(0x40, register, bytes([value >> 8, value & 0xFF]))
alert = world.board.pins.digital(21)
"""


def test_the_monitor_wakes_with_its_reset_values_and_says_who_it_is() -> None:
    """Source: SBOS547, from memory: configuration 4127h, manufacturer 5449h, die 2260h."""
    check(
        MONITOR
        + """
assert [read(register) for register in (0, 6, 7, 0xFE, 0xFF)] == [0x4127, 0x0008, 0, 0x5449, 0x2260]
write(0, 0x0FFF)
assert read(0) == 0x4FFF  # bits 14 to 12 are fixed
write(0, 0x8000)
assert read(0) == 0x4127
"""
    )


def test_the_shunt_s_voltage_is_in_counts_of_two_and_a_half_microvolt_and_clips() -> None:
    check(
        MONITOR
        + """
asked = world.sink(2.0)
world.run_s(0.02)
near(read(1), asked * 0.01 / 2.5e-6, 2)
world.board.pins.monitor._ohm = 0.1
assert read(1) == 32767  # 0.1 ohm clips at 0.819 A
"""
    )


def test_only_a_latched_alert_outlasts_its_cause_and_reading_lets_go_of_it() -> None:
    check(
        MONITOR
        + """
write(7, 4000)  # 1 A
for mask, outlasts in ((0x8000, False), (0x8001, True)):
    write(6, mask)
    world.sink(1.5)
    world.run_s(0.01)
    assert alert.value() == 0
    world.demand(0.5)
    world.run_s(0.01)
    assert (alert.value() == 0) == outlasts
    world.run_s(0.01)  # an amplifier that was held is wound up, and overshoots for a moment
    assert bool(read(6) & 0x10) == outlasts
    world.run_s(0.01)
    assert alert.value() == 1
    assert not read(6) & 0x10
"""
    )


def test_the_pulse_width_output_has_the_steps_that_its_frequency_leaves() -> None:
    """Source: RP2040 datasheet section 4.5.2: TOP + 1 = 125 MHz / frequency; CC = TOP + 1 is always high."""
    script = """
dac = {"part": "PWM", "address": 0x60, "pin": 10, "reference_V": 3.3}
world = World({"kind": "supply", "voltage_V": 10.0, "resistance_ohm": 0.1}, dac=dac)
shown = []
world.plant.set_dac = shown.append
for frequency_Hz, steps in ((30518, 4096), (125_000, 1000), (1_000_000, 125)):
    output = world.board.pins.pwm(10, frequency_Hz)
    assert output.period == steps
    output.duty_u16(65535)
    output.duty_u16(0)
assert shown == [0.0, 3.3, 0.0] * 3, shown
"""
    check(script)
    check_under_cpython(script)


def test_the_own_converter_gives_twelve_bits_repeated_from_the_top() -> None:
    check("""
adc = plant()["adc"]
adc["part"] = "RP2"
world = World({"kind": "supply", "voltage_V": 10.0, "resistance_ohm": 0.1}, adc=adc)
before = world.plant.now
value = world.board.pins.analogue(27).read_u16()
code = value >> 4
near(code, (0.1 + 10.0 / 11.0) / 3.3 * 4096, 1)
assert value == code << 4 | code >> 8
assert world.plant.now - before == 2  # 96 cycles of 48 MHz
""")
