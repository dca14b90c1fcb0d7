"""The microcontroller's own converters, from the RP2040 datasheet: PWM (section 4.5) and ADC (section 4.9).

PWM: a counter of the 125 MHz clock runs from 0 to TOP, and the output is high while it is below the compare level
CC, so the mean is supply * CC / (TOP + 1) (section 4.5.2.2). As the port documents it, a duty of 65535 is all of a
period and TOP follows from the frequency. The low-pass behind it is left out: it is quicker than a control step.

ADC: 12 bits against ADC_VREF, GPIO 26 to 29 as inputs 0 to 3, 96 cycles of 48 MHz a conversion (section 4.9.2), and
four codes that are some nine codes wide (erratum RP2040-E11). The port gives 16 bits: the 12 repeated from the top.
"""

_CLOCK_Hz = 125_000_000
_LARGEST_DUTY = 65535
_CONVERSION_us = 2
_FIRST_GPIO = 26
_FRACTION = 16
_HALF = 1 << (_FRACTION - 1)
# Noise and offset come in the counts of 15 bits that the board file speaks of: an eighth of a code each.
_COUNT_BITS = 3
_LARGEST_CODE = 4095
_WIDE_CODES = (0x200, 0x600, 0xA00, 0xE00)
_WIDE = 9


class Pins:
    def __init__(self, entry, plant, noise):
        self._entry = entry
        self._plant = plant
        self._noise = noise
        #: The output that drives the set-point, once it was made.
        self.output = None
        #: The current monitor, if its ALERT comes in at a pin.
        self.monitor = None

    def pwm(self, number, frequency_Hz):
        entry = self._entry["dac"]
        if entry["pin"] != number:
            raise ValueError("nothing is connected to GPIO " + str(number))
        self.output = Output(entry, self._plant, frequency_Hz)
        return self.output

    def digital(self, number):
        """An input with a pull-up: an object with `value()`."""
        if self.monitor is None or self._entry["monitor"]["pin"] != number:
            raise ValueError("nothing is connected to GPIO " + str(number))
        return self.monitor

    def analogue(self, number):
        return Input(self._entry["adc"], self._plant, self._noise, number - _FIRST_GPIO)


class Output:
    def __init__(self, entry, plant, frequency_Hz):
        self._plant = plant
        self._reference_V = entry["reference_V"]
        self.period = (_CLOCK_Hz + frequency_Hz // 2) // frequency_Hz
        self.level = 0
        plant.set_dac(0.0)

    def duty_u16(self, duty):
        if not 0 <= duty <= _LARGEST_DUTY:
            raise ValueError("duty_u16 must be from 0 to 65535")
        self.level = duty * self.period // _LARGEST_DUTY
        self._plant.set_dac(self._reference_V * self.level / self.period)


class Input:
    def __init__(self, entry, plant, noise, number):
        if not 0 <= number <= 3:
            raise ValueError("no analogue input")
        self._plant = plant
        self._noise = noise
        self._number = number
        # Codes with 16 fractional bits per nanovolt, times 2**20.
        per_nV = (entry.get("gain") or 1.0) * 4096.0 / (entry["supply_V"] * 1e9)
        self._scale = int(per_nV * 65536.0 * 1048576.0 + 0.5)
        self._offset = int((entry.get("offset_counts") or 0.0) * 65536.0 / (1 << _COUNT_BITS)) + _HALF

    def read_u16(self):
        plant = self._plant
        plant.now += _CONVERSION_us
        if plant.moving or plant.now >= plant.due:
            plant.look()
        level = plant.pins[self._number]
        if plant.has_ripple:
            level += plant.ripple(self._number, plant.now, _CONVERSION_us)
        exact = (level * self._scale >> 20) + self._offset + (self._noise.draw() >> _COUNT_BITS)
        code = min(max(exact >> _FRACTION, 0), _LARGEST_CODE)
        for wide in _WIDE_CODES:
            if wide <= code < wide + _WIDE:
                code = wide
        return code << 4 | code >> 8
