"""Readings of an uncalibrated board: which parts count, how much, and what is common to two readings."""

from __future__ import annotations

import math

import msgspec
import pytest

from sinkwright import thermistor
from sinkwright.definitions.board import BoardFile
from sinkwright.definitions.loading import load_board
from sinkwright.uncertainty import remedies
from sinkwright.uncertainty.causes import Cause, Uncertain, expand
from sinkwright.uncertainty.parts import Averaged, PartsModel, average

BOARD = load_board(None)
MODEL = PartsModel(BOARD)


def steady(mean: float, label: str = "scatter") -> Averaged:
    """A mean of readings that do not scatter."""
    return Averaged(mean, 0.0, 100, label)


def limits(value: Uncertain) -> dict[str, float]:
    """Largest error by cause, in the value's unit."""
    return {cause.name: abs(s) * cause.spread for cause, s in value.parts.items()}


def board_with(table: str, **changes: float) -> BoardFile:
    changed = msgspec.structs.replace(getattr(BOARD, table), **changes)
    return msgspec.structs.replace(BOARD, **{table: changed})


def test_the_limits_of_a_voltage_follow_from_the_parts() -> None:
    """Shipped board at 11 V, by hand: 0.3 % of 11 V; 5 % of 0.1 V times 11; 2 mV times 11; 3 counts of 125 uV
    times 11; 0.15 % of 11 V and of the pedestal's 1.1 V; 25 ppm/K and 40 ppm/K over 15 K."""
    found = limits(MODEL.voltage(steady(11.0)))
    assert found["voltage gain: divider"] == pytest.approx(0.033)
    assert found["voltage offset: pedestal"] == pytest.approx(0.055)
    assert found["voltage offset: amplifier"] == pytest.approx(0.022)
    assert found["voltage offset: converter"] == pytest.approx(0.004125)
    assert found["converter gain"] == pytest.approx(0.01815)
    assert found["voltage gain: divider with temperature"] == pytest.approx(0.004125)
    assert found["converter gain with temperature"] == pytest.approx(0.00726)
    assert found["steps of the converter at 11.000 V"] == pytest.approx(0.0006875)
    assert found["nonlinearity of the converter at 11.000 V"] == pytest.approx(0.001375)


def test_the_limits_of_a_current_follow_from_the_parts() -> None:
    """Shipped board at 4 A, by hand: 1 %, 0.3 %, 0.15 %; 50 ppm/K over 15 K and 12 K of its own warmth; the
    zero's drift of 10 uV at the amplifier's input over 25 mohm.
    """
    found = limits(MODEL.current(steady(4.0)))
    assert found["current gain: sense resistor"] == pytest.approx(0.04)
    assert found["current gain: amplifier"] == pytest.approx(0.012)
    assert found["converter gain"] == pytest.approx(0.006)
    assert found["current gain: sense resistor with temperature"] == pytest.approx(4 * 50e-6 * 27)
    assert found["current zero: drift"] == pytest.approx(0.0004)
    assert found["current zero: noise"] == pytest.approx(0.0002 / 8)
    assert found["steps of the converter at 4.0000 A"] == pytest.approx(0.0001)


def test_the_measured_zero_leaves_nothing_of_pedestal_and_offset_in_a_current() -> None:
    worse = board_with("current_sense", pedestal_tolerance_percent=10.0)
    assert limits(PartsModel(worse).current(steady(2.0))) == limits(MODEL.current(steady(2.0)))
    assert not any("pedestal" in name for name in limits(MODEL.current(steady(2.0))))


def test_a_voltage_keeps_its_pedestals_tolerance() -> None:
    better = PartsModel(board_with("voltage_sense", pedestal_tolerance_percent=0.5))
    assert (
        expand(better.voltage(steady(12.0))).half_width < 0.9 * expand(MODEL.voltage(steady(12.0))).half_width
    )


def test_a_small_current_knows_no_gain() -> None:
    gains = {name: size for name, size in limits(MODEL.current(steady(0.0))).items() if "gain" in name}
    assert set(gains.values()) == {0.0}


def test_a_difference_of_two_readings_on_one_range_is_better_than_either() -> None:
    first, second = MODEL.voltage(steady(12.05)), MODEL.voltage(steady(11.95))
    assert expand(first - second).half_width < expand(second).half_width / 20


def test_two_places_of_the_range_err_by_steps_and_nonlinearity_of_their_own() -> None:
    found = limits(MODEL.voltage(steady(12.05)) - MODEL.voltage(steady(11.95)))
    assert found["nonlinearity of the converter at 12.050 V"] == pytest.approx(0.001375)
    assert found["nonlinearity of the converter at 11.950 V"] == pytest.approx(0.001375)
    assert found["voltage offset: pedestal"] == 0.0


def test_the_mean_over_many_frames_keeps_the_gains_error() -> None:
    few = average([11.9990, 12.0010] * 2, "few")
    many = average([11.9990, 12.0010] * 2000, "many")
    assert many.std_of_mean < few.std_of_mean / 20
    assert (
        limits(MODEL.voltage(many))["voltage gain: divider"]
        == limits(MODEL.voltage(few))["voltage gain: divider"]
    )
    assert expand(MODEL.voltage(many)).half_width > 0.99 * expand(MODEL.voltage(steady(12.0))).half_width


def test_the_converters_gain_cancels_in_a_resistance_but_for_the_pedestal() -> None:
    resistance = MODEL.voltage(steady(12.0)) / MODEL.current(steady(2.0))
    # 0.15 % of the pedestal's 1.1 V, over 2 A
    assert limits(resistance)["converter gain"] == pytest.approx(0.0015 * 1.1 / 2)


def test_scatter_counts_with_its_degrees_of_freedom() -> None:
    value = MODEL.voltage(Averaged(12.0, 0.004, 10, "scatter at 1 A"))
    cause = next(cause for cause in value.parts if cause.name == "scatter at 1 A")
    assert (cause.shape, cause.spread, cause.dof) == ("t", 0.004, 9.0)
    assert cause.remedy == remedies.MEASURE_LONGER


def test_a_single_frame_is_given_the_converters_noise() -> None:
    value = MODEL.current(average([2.0], "one frame"))
    cause = next(cause for cause in value.parts if cause.name == "one frame")
    assert (cause.shape, cause.spread) == ("normal", pytest.approx(0.0002))


def test_ripple_counts_once_it_stands_out_of_the_noise() -> None:
    assert not any("ripple" in n for n in limits(PartsModel(BOARD, ripple_V_pp=0.006).voltage(steady(12.0))))
    seen = PartsModel(BOARD, ripple_V_pp=0.1)
    ten = limits(seen.voltage(Averaged(12.0, 0.0, 10, "x")))["ripple between samples (x)"]
    hundred = limits(seen.voltage(Averaged(12.0, 0.0, 100, "x")))["ripple between samples (x)"]
    assert 0.0003 < ten < 0.002
    assert hundred < ten / 5
    own = MODEL.voltage(Averaged(12.0, 0.0, 10, "x"), ripple_V_pp=0.1)
    assert limits(own)["ripple between samples (x)"] == ten


def test_the_temperature_of_a_thermistor_from_its_parts() -> None:
    """Against the divider itself: parts at their limits, read back through the nominal circuit."""
    ntc, true_degC = BOARD.thermistor.heatsink, 60.0
    found = limits(MODEL.temperature(steady(true_degC)))
    curve = {"r25_ohm": ntc.r25_ohm, "curve": ntc.curve, "beta_K": ntc.beta_K}
    ohm = thermistor.resistance_ohm(true_degC, **curve)
    by_value = thermistor.temperature_degC(ohm * 1.02, **curve)
    share = thermistor.divider_share(ohm, ntc.pullup_ohm * 1.01)
    by_pullup = thermistor.temperature_degC(thermistor.divider_resistance(share, ntc.pullup_ohm), **curve)
    node = thermistor.divider_share(ohm, ntc.pullup_ohm) * 1.0015
    by_gain = thermistor.temperature_degC(thermistor.divider_resistance(node, ntc.pullup_ohm), **curve)
    assert found["thermistor: value"] == pytest.approx(abs(by_value - true_degC), rel=0.05)
    assert found["thermistor: pull-up"] == pytest.approx(abs(by_pullup - true_degC), rel=0.05)
    assert found["converter gain"] == pytest.approx(abs(by_gain - true_degC), rel=0.05)
    assert 0.3 < expand(MODEL.temperature(steady(true_degC))).half_width < 1.5


@pytest.mark.parametrize("name", ["voltage", "current", "temperature"])
def test_every_share_that_matters_has_a_remedy(name: str) -> None:
    value = getattr(MODEL, name)(steady(3.0))
    whole = value.standard**2
    for contribution in expand(value).contributions:
        assert contribution.remedy or contribution.standard**2 < 0.05 * whole


def test_causes_are_the_same_for_every_model_of_one_board() -> None:
    first, second = MODEL.voltage(steady(12.0)), PartsModel(load_board(None)).voltage(steady(12.0))
    assert set(first.parts) == set(second.parts)
    assert all(isinstance(cause, Cause) and math.isfinite(cause.spread) for cause in first.parts)
