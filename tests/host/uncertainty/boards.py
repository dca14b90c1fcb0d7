"""Invented boards, each with errors of its own, and what they would read: without the code under test.

The circuit is that of the board file's comments, with every error drawn from the distribution that a maker's
tolerance stands for. The air is as warm as the board must stand, so that every temperature coefficient
counts.
"""

from __future__ import annotations

from dataclasses import dataclass
from random import Random

from sinkwright.definitions.board import BoardFile

FRAMES = 10
PAIRS = 21
ZERO_SAMPLES = 64


@dataclass
class InventedBoard:
    """One board built to the file. `volts` and `amperes` are the frames it would send for a true value."""

    board: BoardFile
    seed: int

    def __post_init__(self) -> None:
        draw = self.draw = Random(f"invented board {self.seed}")
        adc, volt, amp = self.board.adc, self.board.voltage_sense, self.board.current_sense
        warmer_K = self.board.heatsink.ambient_degC - 25.0

        def share(percent: float) -> float:
            return 1 + draw.uniform(-percent, percent) / 100

        def with_heat(ppm_per_K: float) -> float:
            return draw.uniform(-ppm_per_K, ppm_per_K) * 1e-6

        self.warmer_K = warmer_K
        self.adc_gain = share(adc.gain_tolerance_percent) * (
            1 + with_heat(adc.gain_drift_ppm_per_K) * warmer_K
        )
        self.adc_offset = draw.uniform(-adc.offset_counts, adc.offset_counts)
        self.ratio = (
            volt.ratio
            * share(volt.ratio_tolerance_percent)
            * (1 + with_heat(volt.ratio_drift_ppm_per_K) * warmer_K)
        )
        self.volt_pedestal_V = volt.pedestal_V * share(volt.pedestal_tolerance_percent)
        self.volt_offset_V = draw.uniform(-volt.offset_V, volt.offset_V)
        self.sense_ohm = amp.resistance_ohm * share(amp.resistance_tolerance_percent)
        self.sense_per_K = with_heat(amp.resistance_drift_ppm_per_K)
        self.gain = amp.amplifier_gain * share(amp.amplifier_gain_tolerance_percent)
        self.amp_pedestal_V = amp.pedestal_V * share(amp.pedestal_tolerance_percent)
        self.amp_offset_V = draw.uniform(-amp.amplifier_offset_V, amp.amplifier_offset_V)
        # A hundredth of its offset limit for each of ten kelvin since the zero was measured.
        self.amp_drift_V = draw.uniform(-0.1, 0.1) * amp.amplifier_offset_V
        zero_V = self.amp_pedestal_V + self.gain * self.amp_offset_V
        zero_noise = draw.gauss(0, adc.noise_counts / ZERO_SAMPLES**0.5) + draw.uniform(-0.5, 0.5)
        self.zero_counts = self._counts(zero_V) + zero_noise

    def _counts(self, pin_V: float) -> float:
        return pin_V * 32768 / self.board.adc.range_V * self.adc_gain + self.adc_offset

    def _frames(self, counts: float) -> list[float]:
        """Nonlinearity and step at this place of the range, and the noise of each frame's mean."""
        here = counts + self.draw.uniform(-1, 1) + self.draw.uniform(-0.5, 0.5)
        noise = self.board.adc.noise_counts / PAIRS**0.5
        return [here + self.draw.gauss(0, noise) for _ in range(FRAMES)]

    def volts(self, true_V: float) -> list[float]:
        sense, per_count_V = self.board.voltage_sense, self.board.adc.range_V / 32768
        counts = self._counts(self.volt_pedestal_V + self.volt_offset_V + true_V / self.ratio)
        return [(c * per_count_V - sense.pedestal_V) * sense.ratio for c in self._frames(counts)]

    def amperes(self, true_A: float) -> list[float]:
        sense, per_count_V = self.board.current_sense, self.board.adc.range_V / 32768
        heated_K = self.warmer_K + true_A**2 * self.sense_ohm * sense.resistance_thermal_K_per_W
        ohm = self.sense_ohm * (1 + self.sense_per_K * heated_K)
        input_V = true_A * ohm + self.amp_offset_V + self.amp_drift_V
        counts = self._counts(self.amp_pedestal_V + self.gain * input_V)
        scale_A = per_count_V / (sense.resistance_ohm * sense.amplifier_gain)
        return [(c - self.zero_counts) * scale_A for c in self._frames(counts)]
