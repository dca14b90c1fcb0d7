"""The PWM driver against a simulated output that was written from the RP2040 datasheet (section 4.5), not from it."""

from __future__ import annotations

from tests.firmware.running import on_rp2_board
from tests.host.simulator.board_side import check

WORLD = """
import chips
dac = {"part": "PWM", "address": 0x60, "pin": 10, "frequency_Hz": 30518, "reference_V": 3.3}
world = World({"kind": "supply", "voltage_V": 10.0, "resistance_ohm": 0.1}, dac=dac)
driver = chips.driver("dac", dac, world.board)
"""


def test_every_code_is_that_part_of_the_supply_to_within_one() -> None:
    check(
        WORLD
        + """
shown = []
world.plant.set_dac = shown.append
for code in range(4096):
    driver.write(code)
assert shown == sorted(shown)
for code, volt in enumerate(shown):
    near(volt, 3.3 * code / 4096, 3.3 / 4096 + 1e-9)
assert shown[0] == 0.0
"""
    )


def test_prepared_it_gives_nothing() -> None:
    check(
        WORLD
        + """
driver.write(2000)
assert driver.prepare(world.board.clock)
assert world.board.pins.output.level == 0
"""
    )


def test_the_load_draws_what_the_code_asks_for() -> None:
    check(
        WORLD
        + """
driver.prepare(world.board.clock)
world.board.gate.release()
driver.write(int((0.1 + 0.625 * 2.0) / 3.3 * 4096 + 0.5))
world.run_s(0.1)
world.look()
near(world.plant.current_A, 2.0, 0.0015)
"""
    )


def test_the_true_board_makes_the_output_low_and_at_the_frequency_asked_for() -> None:
    found = on_rp2_board("""
        import chips
        it = board.Board(IMAGE)
        driver = chips.driver("dac", {"part": "PWM", "pin": 10, "frequency_Hz": 30518}, it)
        driver.write(4095)
        found = [machine.made[-1], driver._output.duty]
    """)
    assert found == [["PWM", 10, 30518, 0], 4095 << 4]
