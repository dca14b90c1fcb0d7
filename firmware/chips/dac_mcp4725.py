"""MCP4725: one output, 12 bits, its supply as reference (Microchip DS22039).

Only the fast write is used while the load runs: it changes the output and leaves the power-up memory alone.
Allocates nothing after construction. Bus errors (OSError) pass through to the caller.
"""


class MCP4725:
    def __init__(self, bus, entry):
        """`entry` is the image's "dac": address."""
        self._bus = bus
        self._address = entry["address"]
        self._word = bytearray(2)

    def write(self, code):
        """Set the output to `code` (0 to 4095): DS22039 figure 6-1, fast mode, power-down bits 00."""
        word = self._word
        word[0] = code >> 8 & 0x0F
        word[1] = code & 0xFF
        self._bus.writeto(self._address, word)
