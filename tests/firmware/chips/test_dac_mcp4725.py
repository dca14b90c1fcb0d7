"""The DAC's driver against the write commands of its datasheet (Microchip DS22039, figure 6-1)."""

from __future__ import annotations

from tests.firmware.running import on_board


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
