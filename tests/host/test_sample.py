"""Samples: the wire's integers kept, SI units beside them, and the wire's numbers for states and modes."""

from __future__ import annotations

import math
from dataclasses import replace

from sinkwright.sample import FIELD_NAMES, LIMITING_NAMES, MODE_NAMES, STATE_NAMES, Sample
from sinkwright_wire.messages import Telemetry
from sinkwright_wire.vocabulary import Fault, Limiting, Mode, State

TELEMETRY = Telemetry(
    7, 1_500_000, State.SINKING, Mode.CURRENT, Limiting.SOURCE, Fault.NONE, 1_000_000,
    12_000_001, 11_990_000, 12_010_000, 1_000_002, 999_000, 1_001_000, 11_900_000,
    31_500, 42_250, 3_600_000, 43_200_000, 20, 1, 2,
)  # fmt: skip


def test_every_telemetry_field_is_kept_as_it_came() -> None:
    assert Telemetry.__match_args__ == FIELD_NAMES
    sample = Sample.of(TELEMETRY)
    assert [getattr(sample, name) for name in FIELD_NAMES] == [
        getattr(TELEMETRY, name) for name in FIELD_NAMES
    ]


def test_quantities_come_in_si_units() -> None:
    sample = Sample.of(TELEMETRY)
    assert (sample.time_s, sample.voltage_V, sample.current_A) == (1.5, 12.000001, 1.000002)
    assert (sample.voltage_min_V, sample.voltage_max_V, sample.force_V) == (11.99, 12.01, 11.9)
    assert (sample.current_min_A, sample.current_max_A) == (0.999, 1.001)
    assert (sample.heatsink_degC, sample.junction_degC) == (31.5, 42.25)
    assert (sample.charge_C, sample.energy_J) == (3.6, 43.2)
    assert sample.power_W == sample.voltage_V * sample.current_A


def test_a_set_point_is_in_the_unit_of_its_mode() -> None:
    sample = Sample.of(TELEMETRY)
    assert (sample.setpoint_A, sample.setpoint_SI) == (1.0, 1.0)
    resistance = replace(sample, mode=3, setpoint=12_500)
    assert resistance.setpoint_SI == 12.5
    assert math.isnan(resistance.setpoint_A)
    assert math.isnan(replace(sample, mode=0).setpoint_SI)


def test_the_names_are_those_of_the_wires_words() -> None:
    for names, words in ((STATE_NAMES, State), (MODE_NAMES, Mode), (LIMITING_NAMES, Limiting)):
        assert names == {int(word): word.name.lower().replace("_", "-") for word in words}


def test_a_number_that_this_version_does_not_know_is_shown_as_a_number() -> None:
    assert replace(Sample.of(TELEMETRY), state=9).state_name == "state 9"
