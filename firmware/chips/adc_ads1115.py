"""ADS1115: four inputs, 16 bits, one conversion at a time (TI SBAS444).

A conversion is begun by one write of the config register and its result is read a control step later. Before
the result is believed, the config register is read back: the ready flag tells that the part did convert, and
the multiplexer field that it converted what was asked. Repeated equal codes are normal and prove nothing.
Allocates nothing after construction. Bus errors (OSError) pass through to the caller.
"""

from micropython import const

from chips import NOT_CONVERTING, NOT_READY

ON = "bus"
# SBAS444, "Register Map"
_POINTER_CONVERSION = const(0)
_POINTER_CONFIG = const(1)
_OS = const(0x8000)  # write: begin; read: 1 = not converting
_MUX_SINGLE_ENDED = const(0x4000)  # 100b + input number
_MUX_SHIFT = const(12)
_PGA_SHIFT = const(9)
_MODE_SINGLE_SHOT = const(0x0100)
_DR_SHIFT = const(5)
_COMP_QUE_DISABLE = const(0x0003)
_INPUTS = const(4)


class ADS1115:
    def __init__(self, bus, entry):
        """`entry` is the image's "adc": address, inputs, gain_bits (PGA), rate_bits (DR)."""
        self._bus = bus
        self._address = entry["address"]
        base = (
            _OS
            | _MUX_SINGLE_ENDED
            | _MODE_SINGLE_SHOT
            | entry["gain_bits"] << _PGA_SHIFT
            | entry["rate_bits"] << _DR_SHIFT
            | _COMP_QUE_DISABLE
        )
        self._orders = [bytearray(_big_endian(base | number << _MUX_SHIFT)) for number in range(_INPUTS)]
        self._asked = self._orders[0]
        self._word = bytearray(2)
        self.config_seen = 0

    def begin(self, input_number):
        """Start one conversion of AIN`input_number` against ground."""
        self._asked = self._orders[input_number]
        self._bus.writeto_mem(self._address, _POINTER_CONFIG, self._asked)

    def finish(self):
        """The counts of the conversion begun last, or NOT_READY, or NOT_CONVERTING (see `config_seen`)."""
        word = self._word
        self._bus.readfrom_mem_into(self._address, _POINTER_CONFIG, word)
        if word != self._asked:
            return self._why_not()
        self._bus.readfrom_mem_into(self._address, _POINTER_CONVERSION, word)
        # Two's complement: the sign bit turned over counts from the lowest code up.
        return ((word[0] ^ 0x80) << 8 | word[1]) - 0x8000

    def under_way(self):
        """Whether the part says that it converts; true just after `begin`, unless it began nothing.

        In single-shot mode OS reads 0 from the write that begins a conversion to its end ("Config Register"), which is
        later than the read that follows at once: the longest read takes 0.3 ms, the shortest conversion 1 ms.
        """
        word = self._word
        self._bus.readfrom_mem_into(self._address, _POINTER_CONFIG, word)
        self.config_seen = word[0] << 8 | word[1]
        return not word[0] & _OS >> 8

    def _why_not(self):
        self.config_seen = self._word[0] << 8 | self._word[1]
        busy = self._word[0] | _OS >> 8 == self._asked[0] and self._word[1] == self._asked[1]
        return NOT_READY if busy else NOT_CONVERTING


DRIVER = ADS1115


def _big_endian(word):
    return (word >> 8, word & 0xFF)
