"""The analogue front end between the power path and the chips: sense amplifier, dividers, error amplifier.

Each has its own pedestal, gain, offset and output rail; what differs from the nominal circuit was drawn by
whoever made the numbers. Pin levels are published as whole nanovolts, so that the converter can go on in
integers.
"""

import math

_SINE_BITS = 20
_SINE_POINTS = 4096
_TURN = 1_000_000_000


class FrontEnd:
    def __init__(self, plant, remote_sense, source):
        current = plant["current"]
        inputs = plant["adc"]["inputs"]
        self.pins = [0, 0, 0, 0]
        self._gain = current["gain"]
        self._pedestal_V = current["pedestal_V"] + self._gain * current["offset_V"]
        self._setpoint_offset_V = plant["setpoint_offset_V"]
        self._current_rail_V = current["rail_V"]
        self._current_pin = inputs["current"]
        self._heatsink_pin = inputs["heatsink"]
        self._volt_per_A = 0.0
        self.clip_A = 0.0
        self._remote = remote_sense
        self.sense_seen = 1.0  # what the sense pair brings of its voltage: 0 when open, -1 when swapped
        self._voltage = _Divider(plant["voltage"], inputs["voltage"])
        self._force = _Divider(plant["force"], inputs["force"])
        self._ripple = Ripple(source.ripple_Hz) if source.ripple_Hz else None
        self._ripple_V = 0.0

    def demand_A(self, dac_V, sense_ohm):
        """The current at which the sense amplifier equals the DAC; negative for a DAC at rest."""
        return (dac_V - self._setpoint_offset_V - self._pedestal_V) / (self._gain * sense_ohm)

    def set_heatsink(self, pin_V, sense_ohm):
        self.pins[self._heatsink_pin] = int(pin_V * 1e9)
        self._volt_per_A = self._gain * sense_ohm
        self.clip_A = (self._current_rail_V - self._pedestal_V) / self._volt_per_A

    def publish(self, source_V, terminal_V, current_A):
        """Pin levels for these three, which may be means over a window."""
        pins = self.pins
        volt = self._pedestal_V + self._volt_per_A * current_A
        pins[self._current_pin] = int(min(max(volt, 0.0), self._current_rail_V) * 1e9)
        voltage = self._voltage
        pins[voltage.pin] = voltage.level_nV(self.sense_seen * (source_V if self._remote else terminal_V))
        pins[self._force.pin] = self._force.level_nV(terminal_V)

    def set_ripple(self, amplitude_V):
        """Set what the dividers see of the source's ripple; return whether there is any."""
        if amplitude_V != self._ripple_V:
            self._ripple_V = amplitude_V
            self._voltage.ripple_nV = int(amplitude_V / self._voltage.ratio * 1e9)
            self._force.ripple_nV = int(amplitude_V / self._force.ratio * 1e9)
        return amplitude_V > 0.0

    def ripple(self, pin, end_us, window_us):
        """Mean of the ripple over the window that ends at `end_us`, in nanovolts at `pin`."""
        if pin == self._voltage.pin:
            return self._voltage.ripple_nV * self._ripple.mean(end_us, window_us) >> _SINE_BITS
        if pin == self._force.pin:
            return self._force.ripple_nV * self._ripple.mean(end_us, window_us) >> _SINE_BITS
        return 0


class Ripple:
    """A sine that a converter averages over its window: A*sin(w*T/2)/(w*T/2) * sin(w*middle), in integers."""

    def __init__(self, frequency_Hz):
        self._omega_per_us = 2e-6 * math.pi * frequency_Hz
        # In millihertz the phase is a whole number of parts of 10**9, and time may wrap at 10**9 us.
        self._mHz = int(frequency_Hz * 1000.0 + 0.5)
        one = 1 << _SINE_BITS
        self._sine = [int(one * math.sin(2.0 * math.pi * k / _SINE_POINTS)) for k in range(_SINE_POINTS)]
        self._window_us = 0
        self._share = 0

    def mean(self, end_us, window_us):
        """Mean of the sine over the window, times 2**_SINE_BITS."""
        if window_us != self._window_us:
            self._window_us = window_us
            half = self._omega_per_us * window_us / 2.0
            self._share = int(math.sin(half) / half * (1 << _SINE_BITS))
        middle_us = (end_us - (window_us >> 1)) % _TURN
        phase = middle_us * self._mHz % _TURN
        return self._sine[phase * _SINE_POINTS // _TURN] * self._share >> _SINE_BITS


class _Divider:
    """pin = pedestal + offset + V/ratio, within the buffer's rails."""

    def __init__(self, entry, pin):
        self.pin = pin
        self.ratio = entry["ratio"]
        self._base_V = entry["pedestal_V"] + entry["offset_V"]
        self._rail_V = entry["rail_V"]
        self.ripple_nV = 0

    def level_nV(self, volt):
        return int(min(max(self._base_V + volt / self.ratio, 0.0), self._rail_V) * 1e9)
