"""RP2: the microcontroller's own converter, 12 bits, four inputs (RP2040 datasheet section 4.9).

Input n is GPIO 26 + n. A conversion takes 96 cycles of 48 MHz, 2 us (section 4.9.2), so there is nothing to begin:
`finish` takes the mean of 32 conversions, which gains about two bits of its noise. The converter of the RP2040
has about 8.7 effective bits, and four codes (512, 1536, 2560, 3584) that are some nine codes wide (erratum
RP2040-E11), which no mean removes: good for a thermistor, and for a load whose current is read with a meter. An
external reference at ADC_VREF makes it worth calibrating. Allocates nothing after construction.
"""

from micropython import const

ON = "pins"
_FIRST_GPIO = const(26)
_INPUTS = const(4)
_CONVERSIONS = const(32)
# The port gives 16 bits whose upper 12 are the conversion's. The sum of 32 such codes is 17 bits of counts, and what
# the scales expect is 15, as of any converter: full scale is 32768.
_CODE_SHIFT = const(4)
_SUM_SHIFT = const(2)


class RP2:
    def __init__(self, pins, entry):
        """`entry` is the image's "adc"; its inputs are 0 to 3."""
        self._inputs = [pins.analogue(_FIRST_GPIO + number) for number in range(_INPUTS)]
        self._asked = self._inputs[0]
        self.config_seen = 0

    def begin(self, input_number):
        self._asked = self._inputs[input_number]

    def finish(self):
        """Counts of the input asked for, as of now."""
        read_u16 = self._asked.read_u16
        total = 0
        for _ in range(_CONVERSIONS):
            total += read_u16() >> _CODE_SHIFT
        return total >> _SUM_SHIFT


DRIVER = RP2
