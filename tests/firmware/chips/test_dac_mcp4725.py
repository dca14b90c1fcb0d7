"""The DAC's driver against the commands of its datasheet (Microchip DS22039, figures 6-1 to 6-3)."""

from __future__ import annotations

import json

from tests.firmware.running import on_board
from tests.host.simulator.board_side import check


def test_the_fast_write_is_two_bytes_with_the_power_down_bits_clear() -> None:
    found = on_board("""
        from chips.dac_mcp4725 import MCP4725
        class Bus:
            def writeto(self, address, data):
                written.append([address] + list(data))
        written = []
        dac = MCP4725(Bus(), {"address": 0x60})
        for code in (0, 1, 0x123, 4095):
            dac.write(code)
        found = written
    """)
    assert found == [[0x60, 0x00, 0x00], [0x60, 0x00, 0x01], [0x60, 0x01, 0x23], [0x60, 0x0F, 0xFF]]


PREPARING = """
from chips.dac_mcp4725 import MCP4725
from nominal_board import World
made = World({{"kind": "supply", "voltage_V": 12.0, "resistance_ohm": 0.1}})
chip = made.board.dac
{arrange}
dac = MCP4725(made.bus, {{"address": 0x60}})
before_us = made.plant.now
good = dac.prepare(made.board.clock)
took_us = made.plant.now - before_us
chip.general_call(0x06)  # as at power-up: the memory is loaded
print([good, chip.code, chip.output_V(), took_us])
"""


def prepared(arrange: str) -> tuple[bool, int, float, int]:
    """On the simulated chip, which was written from the datasheet and not from the driver."""
    good, code, volt, took_us = json.loads(check(PREPARING.format(arrange=arrange)).lower())
    return good, code, volt, took_us


def test_a_new_part_that_wakes_at_mid_scale_wakes_at_zero_ever_after() -> None:
    """The EEPROM takes 25 ms (DS22039: typically), during which the part ignores commands."""
    good, code, volt, took_us = prepared("chip._eeprom = chip.code = 0x800")
    assert (good, code, volt) == (True, 0, 0.0)
    assert 25_000 <= took_us < 60_000


def test_a_part_that_wakes_at_zero_is_not_written_again() -> None:
    """The EEPROM stands a million writes (from memory), but no write is needed."""
    good, code, _, took_us = prepared("pass")
    assert (good, code) == (True, 0)
    assert took_us < 1_000


def test_power_down_bits_in_the_memory_are_cleared_too() -> None:
    """Powered down, the output hangs on a resistor to ground (table 5-2) and follows no code."""
    good, code, volt, _ = prepared("chip._eeprom_down = 2")
    assert (good, code, volt) == (True, 0, 0.0)


def test_a_memory_that_does_not_keep_zero_is_told() -> None:
    good, *_ = prepared("""
chip._eeprom = 0x800
true = chip.write
chip.write = lambda data: true(data) if data[0] < 0x40 else None
""")
    assert good is False


def test_a_part_that_never_is_ready_is_given_up_after_a_tenth_of_a_second() -> None:
    good, _, _, took_us = prepared("chip._busy_until = 1 << 29")
    assert good is False
    assert 50_000 < took_us < 150_000
