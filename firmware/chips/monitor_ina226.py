"""INA226: a current monitor whose ALERT is a second trip, in hardware (TI SBOS547).

Its own shunt stands in the source lead, and ALERT, which pulls to ground, sits on the gate clamp and on a pin of the
microcontroller: a current above the limit clamps without the firmware, within two conversions of 332 us, and the
firmware sees the pin. The alert latches; reading Mask/Enable lets go of it, which is done only when a fault is
cleared. Register names are the datasheet's ("Register Maps"); fields and sizes are from memory: shunt voltage 2.5 uV a
count, +-81.92 mV. `tripped` allocates nothing. Bus errors (OSError) pass through to the caller.
"""

from micropython import const

ON = "board"
_CONFIG = const(0x00)
_MASK_ENABLE = const(0x06)
_ALERT_LIMIT = const(0x07)
_MANUFACTURER = const(0xFE)
_TEXAS_INSTRUMENTS = const(0x5449)
# Shunt only, continuously, no averaging, 332 us a conversion; bits 14 to 12 always read 100.
_WATCH_SHUNT = const(0x4115)
# Shunt voltage over limit (SOL), latched (LEN). The flags between them come and go.
_OVER_LIMIT_LATCHED = const(0x8001)
_SETTINGS = const(0xFC03)


class INA226:
    def __init__(self, board, entry):
        """`entry` is the image's "monitor": address, pin, limit_uA, limit_counts."""
        self._bus = board.bus
        self._alert = board.pins.digital(entry["pin"])
        self._address = entry["address"]
        self._limit_counts = entry["limit_counts"]
        self._word = bytearray(2)
        self.limit_uA = entry["limit_uA"]

    def prepare(self, clock):
        """Set the trip; return whether it reads back as set."""
        self._write(_CONFIG, _WATCH_SHUNT)
        self._write(_ALERT_LIMIT, self._limit_counts)
        self._write(_MASK_ENABLE, _OVER_LIMIT_LATCHED)
        return (
            self._read(_MANUFACTURER) == _TEXAS_INSTRUMENTS
            and self._read(_CONFIG) == _WATCH_SHUNT
            and self._read(_ALERT_LIMIT) == self._limit_counts
            and self._read(_MASK_ENABLE) & _SETTINGS == _OVER_LIMIT_LATCHED
        )

    def tripped(self):
        """Whether ALERT holds the gate."""
        return not self._alert.value()

    def rearm(self):
        """Let go of ALERT; it pulls again with the next conversion above the limit."""
        self._read(_MASK_ENABLE)

    def _write(self, register, value):
        self._word[0] = value >> 8
        self._word[1] = value & 0xFF
        self._bus.writeto_mem(self._address, register, self._word)

    def _read(self, register):
        self._bus.readfrom_mem_into(self._address, register, self._word)
        return self._word[0] << 8 | self._word[1]


DRIVER = INA226
