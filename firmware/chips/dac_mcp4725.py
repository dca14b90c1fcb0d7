"""MCP4725: one output, 12 bits, its supply as reference (Microchip DS22039).

While the load runs only the fast write is used: it changes the output and leaves the power-up memory alone. A new
part wakes at mid-scale (from memory: factory default of the EEPROM), so `prepare` makes the memory zero, once.
`write` allocates nothing. Bus errors (OSError) pass through to the caller.
"""

from micropython import const

ON = "bus"
# DS22039, figure 6-2: C2 C1 C0 = 011 writes the DAC register and the EEPROM.
_WRITE_BOTH = b"\x60\x00\x00"
# Figure 6-3: a read gives status, DAC register (2 octets), EEPROM (2 octets).
_READ_BYTES = const(5)
_READY = const(0x80)
_REGISTER_POWER_DOWN = const(0x06)
_EEPROM_POWER_DOWN_AND_CODE = const(0x6F)
# The EEPROM takes 25 ms, 50 ms at most; commands are ignored meanwhile.
_LOOK_EVERY_us = const(5_000)
_LOOKS = const(20)


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

    def prepare(self, clock):
        """With the gate clamped: make output and power-up memory zero; return whether they read back as zero."""
        self.write(0)
        state = self._when_ready(clock)
        if state is not None and not _wakes_at_zero(state):
            self._bus.writeto(self._address, _WRITE_BOTH)
            state = self._when_ready(clock)
        return state is not None and _wakes_at_zero(state) and _gives_zero(state)

    def _when_ready(self, clock):
        """All five octets once no write to the EEPROM is going on, or None."""
        state = bytearray(_READ_BYTES)
        for _ in range(_LOOKS):
            self._bus.readfrom_into(self._address, state)
            if state[0] & _READY:
                return state
            clock.wait_until(clock.add(clock.ticks_us(), _LOOK_EVERY_us))
        return None


DRIVER = MCP4725


def _gives_zero(state):
    return not (state[0] & _REGISTER_POWER_DOWN or state[1] or state[2] & 0xF0)


def _wakes_at_zero(state):
    return not (state[3] & _EEPROM_POWER_DOWN_AND_CODE or state[4])
