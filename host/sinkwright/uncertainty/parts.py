"""Readings of a board that nobody has calibrated: each carries the tolerances of the parts it came through.

The circuit is the board file's. At the converter's pin stands, in V (all tolerances are rectangular: the
maker says how large, not how likely, JCGM 100 4.3.7),

    voltage   pedestal + offset + V / ratio
    current   pedestal + gain * (R * I + offset)

and the converter adds its own gain, offset, nonlinearity and steps. The board measures the current zero with
the gate clamped before each run and takes it off, so pedestal and offsets of the current leave only the
zero's own noise, step and drift; the voltage has no such zero, and keeps all of them. Parts that two readings
share are one cause. It must not know how readings were taken, nor any verdict.
"""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

from sinkwright import thermistor
from sinkwright.uncertainty import remedies
from sinkwright.uncertainty.averaging import Averaged, average
from sinkwright.uncertainty.causes import Cause, Uncertain
from sinkwright.uncertainty.ripple import worst_mains_bound

if TYPE_CHECKING:
    from sinkwright.definitions.board import BoardFile

__all__ = ["Averaged", "PartsModel", "average"]

#: ADS1115: largest distance from a straight line, in counts (from memory: TI SBAS444, INL).
ADC_NONLINEARITY_COUNTS = 1.0
#: Conversions that the firmware averages for the current zero.
ZERO_SAMPLES = 64
#: An amplifier whose offset is small by design drifts by about a hundredth of its limit per kelvin, so a 100
#: uV part by 1 uV/K; and a board warms by some 10 K between its zero and the end of a run (common practice,
#: no source).
OFFSET_DRIFT_PER_K = 0.01
WARMING_SINCE_ZERO_K = 10.0
#: Parts' values are stated at 25 degC.
REFERENCE_DEGC = 25.0
LEAST_ROOM_SPAN_K = 5.0
#: Tolerance of an NTC's curve: B within 0.75 % (from memory: Vishay 29049).
BETA_TOLERANCE = 0.0075
TYPICAL_BETA_K = 3977.0
#: Largest error of the firmware's table (see thermistor.divider_table).
TABLE_ERROR_K = 0.05
#: Less than this many deviations of the noise between a window's extremes is noise, not ripple.
NOISE_BAND = 6.0


class PartsModel:
    """Turns averaged readings of one board into uncertain values.

    `ripple_V_pp` is the difference between the extremes of the voltage within one frame, if any was seen, and
    `frame_s` the length of the frames that were averaged (see `ripple` for the model).
    """

    def __init__(self, board: BoardFile, *, ripple_V_pp: float | None = None, frame_s: float = 0.1) -> None:
        self._board = board
        self._room_K = max(board.heatsink.ambient_degC - REFERENCE_DEGC, LEAST_ROOM_SPAN_K)
        self._ripple_V_pp = ripple_V_pp or 0.0
        self._frame_s = frame_s

    def voltage(self, reading: Averaged, *, ripple_V_pp: float | None = None) -> Uncertain:
        """The voltage in V between the sense pair's ends (or at the terminals, where there is none).

        `ripple_V_pp` is what this reading's own frames showed, in place of the model's.
        """
        board, sense = self._board, self._board.voltage_sense
        volt, count_V = reading.mean, self._board.adc.count_V * self._board.voltage_sense.ratio
        by_meter = remedies.CALIBRATE
        # The converter's gain acts on the pedestal as well, which is taken off at its nominal value.
        at_pin_V = volt + sense.pedestal_V * sense.ratio
        drift = self._room_K * 1e-6
        pedestal_V = sense.pedestal_V * sense.pedestal_tolerance_percent / 100
        parts = {
            _rectangular("voltage gain: divider", sense.ratio_tolerance_percent / 100, by_meter): volt,
            _rectangular(
                "voltage gain: divider with temperature",
                sense.ratio_drift_ppm_per_K * drift,
                remedies.STEADY_ROOM,
            ): volt,
            _rectangular("voltage offset: pedestal", pedestal_V, by_meter): -sense.ratio,
            _rectangular("voltage offset: amplifier", sense.offset_V, by_meter): -sense.ratio,
            _rectangular("voltage offset: converter", board.adc.offset_counts, by_meter): -count_V,
            **self._converter_gain(at_pin_V),
            **self._single_reading(reading, count_V, f"{volt:.3f} V"),
            **self._ripple(reading, self._ripple_V_pp if ripple_V_pp is None else ripple_V_pp),
        }
        return Uncertain(volt, parts)

    def current(self, reading: Averaged) -> Uncertain:
        """The current in A; the reading has the current zero taken off already."""
        sense = self._board.current_sense
        ampere, count_A = reading.mean, self._board.adc.count_V / sense.V_per_A
        by_meter = remedies.CALIBRATE
        # Warmth of its own, on top of the room's: one temperature coefficient, so one cause.
        warmer_K = self._room_K + ampere**2 * sense.resistance_ohm * sense.resistance_thermal_K_per_W
        parts = {
            _rectangular(
                "current gain: sense resistor", sense.resistance_tolerance_percent / 100, by_meter
            ): -ampere,
            _rectangular(
                "current gain: sense resistor with temperature",
                sense.resistance_drift_ppm_per_K * 1e-6,
                remedies.STEADY_ROOM,
            ): -ampere * warmer_K,
            _rectangular(
                "current gain: amplifier", sense.amplifier_gain_tolerance_percent / 100, by_meter
            ): -ampere,
            **self._converter_gain(ampere),
            **self._current_zero(count_A),
            **self._single_reading(reading, count_A, f"{ampere:.4f} A"),
        }
        return Uncertain(ampere, parts)

    def temperature(self, reading: Averaged) -> Uncertain:
        """The temperature in degC where the thermistor sits."""
        ntc, dac = self._board.thermistor.heatsink, self._board.dac

        def ohm(degC: float) -> float:
            return thermistor.resistance_ohm(degC, r25_ohm=ntc.r25_ohm, curve=ntc.curve, beta_K=ntc.beta_K)

        resistance = ohm(reading.mean)
        # kelvin for a relative change of the resistance, over one kelvin around the reading
        per_share_K = 1.0 / math.log(ohm(reading.mean + 0.5) / ohm(reading.mean - 0.5))
        share = thermistor.divider_share(resistance, ntc.pullup_ohm)
        per_node_K = per_share_K / (1 - share)  # kelvin for a relative change of the node's voltage
        from_25 = 1 / (reading.mean + thermistor.ZERO_DEGC_K) - 1 / (REFERENCE_DEGC + thermistor.ZERO_DEGC_K)
        fit = remedies.BETTER_THERMISTOR
        count_share = self._board.adc.count_V / (share * ntc.supply_V)
        parts = {
            _rectangular("thermistor: value", ntc.r25_tolerance_percent / 100, fit): -per_share_K,
            _rectangular("thermistor: curve", BETA_TOLERANCE, fit): per_share_K * TYPICAL_BETA_K * from_25,
            _rectangular("thermistor: pull-up", ntc.pullup_tolerance_percent / 100, fit): per_share_K,
            _rectangular("thermistor: supply", dac.reference_tolerance_percent / 100, fit): per_node_K,
            _rectangular("thermistor: table", TABLE_ERROR_K, ""): 1.0,
            **self._converter_gain(-per_node_K),
            **self._single_reading(reading, abs(per_node_K) * count_share, f"{reading.mean:.1f} °C"),
        }
        return Uncertain(reading.mean, parts)

    def _converter_gain(self, value: float) -> dict[Cause, float]:
        """One converter reads everything, so its gain cancels in a ratio of voltage and current."""
        adc = self._board.adc
        drift = adc.gain_drift_ppm_per_K * self._room_K * 1e-6
        return {
            _rectangular("converter gain", adc.gain_tolerance_percent / 100, remedies.CALIBRATE): value,
            _rectangular("converter gain with temperature", drift, remedies.STEADY_ROOM): value,
        }

    def _current_zero(self, count_A: float) -> dict[Cause, float]:
        sense, adc = self._board.current_sense, self._board.adc
        drift_A = sense.amplifier_offset_V * OFFSET_DRIFT_PER_K * WARMING_SINCE_ZERO_K / sense.resistance_ohm
        noise = Cause("current zero: noise", "normal", adc.noise_counts / math.sqrt(ZERO_SAMPLES), remedy="")
        return {
            noise: -count_A,
            _rectangular("current zero: steps of the converter", 0.5, remedies.FINER_CONVERTER): -count_A,
            _rectangular("current zero: drift", drift_A, remedies.LET_WARM_UP): -1.0,
        }

    def _single_reading(self, reading: Averaged, count: float, where: str) -> dict[Cause, float]:
        """What belongs to one reading: its scatter, and the converter's errors at this place of its range."""
        finer = remedies.FINER_CONVERTER
        crooked = f"nonlinearity of the converter at {where}"
        return {
            _rectangular(f"steps of the converter at {where}", 0.5, finer): count,
            _rectangular(crooked, ADC_NONLINEARITY_COUNTS, finer): count,
            self._scatter(reading, count): 1.0,
        }

    def _scatter(self, reading: Averaged, count: float) -> Cause:
        name = reading.label or "scatter"
        if reading.n < 2:
            # One reading tells nothing of its scatter, so what is known of the converter's noise stands for
            # it.
            noise = self._board.adc.noise_counts * count
            return Cause(name, "normal", noise, remedy=remedies.MEASURE_LONGER)
        return Cause(name, "t", reading.std_of_mean, dof=reading.n - 1.0, remedy=remedies.MEASURE_LONGER)

    def _ripple(self, reading: Averaged, ripple_V_pp: float) -> dict[Cause, float]:
        adc = self._board.adc
        noise_V = adc.noise_counts * adc.count_V * self._board.voltage_sense.ratio
        if ripple_V_pp <= NOISE_BAND * noise_V:
            return {}
        interval_s = 2 * self._board.control.period_s  # voltage and current take turns
        bound_V = worst_mains_bound(
            ripple_V_pp,
            interval_s=interval_s,
            window_s=1 / adc.samples_per_s,
            samples=max(1.0, reading.n * self._frame_s / interval_s),
        )
        name = f"ripple between samples ({reading.label})"
        return {_rectangular(name, bound_V, remedies.SMOOTH_SOURCE): 1.0}


def _rectangular(name: str, half_width: float, remedy: str) -> Cause:
    return Cause(name, "rectangular", half_width, remedy=remedy)
