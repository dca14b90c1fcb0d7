"""PWM: the microcontroller's own pulse-width output behind a low-pass filter, for the cheapest build.

RP2040 datasheet section 4.5.2: the counter runs from 0 to TOP and the output is high while it is below the compare
level, so the mean is supply * level / (TOP + 1). At about 30.5 kHz TOP + 1 is 4096 on a 125 MHz clock: 12 bits. The
supply of the pin is the reference. The filter must be slow against that frequency and quick against a control step
(two stages of 10 kohm and 10 nF: 0.1 ms each). In reset the pin is an input with a pull-down (section 2.19.6.2), so
the filter rests at zero. Allocates nothing after construction.
"""

from micropython import const

ON = "pins"
# 12 bits of code in the 16 of the port's duty cycle.
_DUTY_SHIFT = const(4)


class PWM:
    def __init__(self, pins, entry):
        """`entry` is the image's "dac": pin, frequency_Hz."""
        self._output = pins.pwm(entry["pin"], entry["frequency_Hz"])

    def prepare(self, clock):
        """Nothing is remembered over a reset, so zero now is all there is to do."""
        self.write(0)
        return True

    def write(self, code):
        """Set the mean to `code` (0 to 4095) in 4096 of the supply."""
        self._output.duty_u16(code << _DUTY_SHIFT)


DRIVER = PWM
