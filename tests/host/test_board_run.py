"""Ends and runs in SI units, and what the wire makes of them."""

from __future__ import annotations

import pytest

from sinkwright.board_run import BoardEnds, BoardRun
from sinkwright.errors import AskedTooMuch
from sinkwright_wire.messages import Run, SetEnds
from sinkwright_wire.vocabulary import RunEnd, Silence, State


def test_ends_become_the_wires_integers_and_none_is_no_end() -> None:
    ends = BoardEnds(2.5, 2.5, 9.0, 36_000.0, 55.0)
    assert ends.to_wire() == SetEnds(2_500_000, 9_000_000, 32_400_000, 36_000_000, 55_000)
    assert BoardEnds().to_wire() == SetEnds()


def test_an_end_of_zero_volts_is_not_taken_for_no_end() -> None:
    assert BoardEnds(voltage_V=0.0).to_wire().voltage_uV == 1


@pytest.mark.parametrize(
    "ends",
    [
        BoardEnds(voltage_V=-1.0),
        BoardEnds(charge_Ah=1200.0),
        BoardEnds(energy_Wh=1200.0),
        BoardEnds(duration_s=4.3e6),
    ],
)
def test_an_end_that_the_wire_has_no_number_for_is_refused(ends: BoardEnds) -> None:
    with pytest.raises(AskedTooMuch):
        ends.to_wire()


def test_ends_too_far_away_to_be_told_are_left_to_the_host() -> None:
    assert BoardEnds(voltage_V=3.0, charge_Ah=1e4, duration_s=3e7).tellable() == BoardEnds(voltage_V=3.0)


def test_a_run_tells_whether_it_goes_on_and_how_long_it_took() -> None:
    run = BoardRun.of(
        Run(7, State.ENDED, RunEnd.CHARGE, False, Silence.CONTINUE, 1_000_000, 61_000_000, 9, 8, 60, 1000)
    )
    assert (run.going, run.alone, run.fetched, run.duration_s) == (False, True, False, 60.0)
