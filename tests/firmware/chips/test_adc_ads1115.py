"""The converter's driver against the register map of its datasheet (TI SBAS444, "Register Map")."""

from __future__ import annotations

from tests.firmware.running import on_board

DRIVER = """
    from chips import adc_ads1115
    board = Board()
    bus = board.bus
    written = []
    through = bus.writeto_mem
    def keep(address, register, data):
        written.append([address, register, data[0] << 8 | data[1]])
        through(address, register, data)
    bus.writeto_mem = keep
    adc = adc_ads1115.ADS1115(bus, board.image["adc"])
"""


def test_a_conversion_is_one_write_of_the_config_register() -> None:
    """OS 1, MUX 100b + input, PGA 001 (4.096 V), MODE 1, DR 111 (860/s), COMP_QUE 11: in the order of the map."""
    found = on_board(
        DRIVER
        + """
    for number in range(4):
        adc.begin(number)
    found = written
"""
    )
    config = [0b1_100_001_1_111_00011 + (number << 12) for number in range(4)]
    assert found == [[0x48, 1, word] for word in config]


def test_counts_are_two_s_complement() -> None:
    found = on_board(
        DRIVER
        + """
    adc.begin(0)
    board.clock.now += 2350
    found = []
    for counts in (0, 1, 32767, -1, -32768):
        bus.counts[0] = counts
        found.append(adc.finish())
"""
    )
    assert found == [0, 1, 32767, -1, -32768]


def test_a_part_still_converting_and_a_part_that_was_reset_are_told_apart() -> None:
    """The power-up value of the config register is 8583h."""
    found = on_board(
        DRIVER
        + """
    adc.begin(2)
    board.clock.now += 2350
    bus.ready = False
    busy = adc.finish() == adc_ads1115.NOT_READY
    bus.ready = True
    bus._config_high, bus._config_low = 0x85, 0x83
    reset = adc.finish() == adc_ads1115.NOT_CONVERTING
    found = [busy, reset, adc.config_seen]
"""
    )
    assert found == [True, True, 0x8583]


def test_whether_a_conversion_is_under_way_is_told_by_the_ready_flag() -> None:
    """OS reads 0 while it converts. A part that began nothing reads 1 at once, with its register as written."""
    found = on_board(
        DRIVER
        + """
    adc.begin(1)
    found = [adc.under_way()]
    board.clock.now += 2350
    found += [adc.under_way(), adc.finish() >= -32768]
    bus.starting = False
    adc.begin(1)
    found += [adc.under_way(), adc.config_seen]
"""
    )
    assert found == [True, False, True, False, 0b1_101_001_1_111_00011]
