"""The driver of the microcontroller's own converter against one that was written from the RP2040 datasheet."""

from __future__ import annotations

from tests.firmware.running import on_rp2_board
from tests.host.simulator.board_side import check

WORLD = """
import chips
def made(noise_counts=0.0, **source):
    adc = plant()["adc"]
    adc.update(part="RP2", noise_counts=noise_counts)
    supply = {"kind": "supply", "voltage_V": 10.0, "resistance_ohm": 0.1}
    supply.update(source)
    world = World(supply, adc=adc)
    return world, chips.driver("adc", adc, world.board)
def counts(driver, number):
    driver.begin(number)
    return driver.finish()
"""


def test_full_scale_is_32768_counts_of_the_reference() -> None:
    check(
        WORLD
        + """
world, driver = made()
near(counts(driver, 1), (0.1 + 10.0 / 11.0) / 3.3 * 32768, 8)
near(counts(driver, 0), 0.1 / 3.3 * 32768, 8)
assert counts(driver, 1) <= 32767
"""
    )


def test_the_mean_of_a_reading_s_conversions_sees_a_quarter_of_a_code() -> None:
    """With noise of a code (8 counts), as 8.7 effective bits have at least, readings resolve finer than a code."""
    check(
        WORLD
        + """
world, driver = made(noise_counts=8.0)
readings = [counts(driver, 1) for _ in range(200)]
mean = sum(readings) / len(readings)
near(mean, (0.1 + 10.0 / 11.0) / 3.3 * 32768, 1.0)
spread = (sum((reading - mean) ** 2 for reading in readings) / len(readings)) ** 0.5
near(spread, 8 / 32 ** 0.5, 0.5)
"""
    )


def test_the_wide_codes_of_the_rp2040_are_there() -> None:
    """Erratum RP2040-E11: code 512 is some nine codes wide, which is 36 mV at the terminals of an 11:1 divider."""
    check(
        WORLD
        + """
codes = set()
for step in range(40):
    volt = ((500 + step) * 3.3 / 4096 - 0.1) * 11.0
    world, driver = made(voltage_V=volt + 1e-4)
    codes.add(counts(driver, 1) >> 3)
missing = [code for code in range(500, 540) if code not in codes]
assert missing == list(range(513, 521)), missing
"""
    )


def test_what_changes_is_read_as_it_is_now() -> None:
    check(
        WORLD
        + """
world, driver = made()
before = counts(driver, 0)
world.sink(2.0)
world.run_s(0.01)
near(counts(driver, 0) - before, 2.0 * 0.625 / 3.3 * 32768, 20)
"""
    )


def test_the_true_board_reads_the_gpio_of_each_input() -> None:
    found = on_rp2_board("""
        import chips
        it = board.Board(IMAGE)
        del machine.made[:]
        driver = chips.driver("adc", {"part": "RP2"}, it)
        machine.analogue = {26: 0, 27: 65535, 28: 32768, 29: 16}
        found = [[entry for entry in machine.made if entry[0] == "ADC"]]
        for number in range(4):
            driver.begin(number)
            found.append(driver.finish())
    """)
    assert found == [[["ADC", 26], ["ADC", 27], ["ADC", 28], ["ADC", 29]], 0, 32760, 16384, 8]
