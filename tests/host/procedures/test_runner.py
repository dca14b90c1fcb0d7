"""However a run ends, the load is off, and what was measured is kept."""

from __future__ import annotations

import pytest

from sinkwright.errors import LinkLost, ProtectionTripped, SinkwrightError
from sinkwright.results import exit_code_of
from sinkwright_wire.messages import Fault, Limiting, State
from tests.host.procedures.carrying_out import SOURCE, Run
from tests.support.fake_instrument import FakeInstrument

REGULATION = '[[test]]\nkind = "load-regulation"\naccept.load_regulation_percent = { max = 2.0 }\n'
HOLD = '[[test]]\nkind = "hold"\ncurrent_A = 1.0\nduration_s = 5.0\n'
PLAN = SOURCE + REGULATION + HOLD
#: A frame well inside the first test's second level.
MIDWAY = 40


def test_a_plan_that_passes_leaves_with_0_and_the_load_off():
    run = Run(PLAN)
    result = run.carry_out()
    assert [test.kind for test in result.tests] == ["load-regulation", "hold"]
    assert result.verdict == "pass"
    assert exit_code_of(result) == 0
    assert not run.instrument.sinking


def test_a_fault_ends_the_run_and_keeps_everything_measured_up_to_then():
    run = Run(PLAN, at_frame={MIDWAY: lambda load: load.trip(Fault.HEATSINK_HOT)})
    result = run.carry_out()
    (test,) = result.tests
    assert test.stopped_by == "heatsink-hot"
    assert test.quantities["no_load_voltage_V"].value == pytest.approx(12.0, abs=0.01)
    assert test.quantities["load_regulation_percent"].value is None
    assert test.points
    assert any("stopped by itself" in note for note in test.notes)
    assert any(line.startswith("hold: not carried out") for line in test.not_tested)
    assert exit_code_of(result) == 3
    assert run.writer.results == [test]
    assert not run.instrument.sinking


def test_derating_makes_the_test_inconclusive():
    def derate(load: FakeInstrument) -> None:
        load.limiting = Limiting.DERATED

    run = Run(PLAN, at_frame={MIDWAY: derate})
    result = run.carry_out()
    assert result.tests[0].stopped_by == "derated"
    assert result.verdict == "inconclusive"
    assert exit_code_of(result) == 4


def test_a_request_to_stop_turns_off_and_leaves_with_130():
    run = Run(PLAN)
    run.instrument.at_frame[MIDWAY] = lambda load: run.stop.request()
    result = run.carry_out()
    assert result.tests[0].stopped_by == "interrupted"
    assert exit_code_of(result) == 130
    assert not run.instrument.sinking


def test_a_load_that_somebody_else_turned_off_is_noticed():
    def turn_off(load: FakeInstrument) -> None:
        load.sinking = False

    result = Run(PLAN, at_frame={MIDWAY: turn_off}).carry_out()
    assert result.tests[0].stopped_by == "turned-off"


def test_an_exception_of_any_kind_turns_the_load_off_first():
    def fail(load: FakeInstrument) -> None:
        raise ZeroDivisionError

    run = Run(PLAN, at_frame={MIDWAY: fail})
    with pytest.raises(ZeroDivisionError):
        run.carry_out()
    assert not run.instrument.sinking


def test_a_lost_link_is_raised_after_the_partial_result_was_kept():
    def lose(load: FakeInstrument) -> None:
        raise LinkLost("the cable is out")

    run = Run(PLAN, at_frame={MIDWAY: lose})
    with pytest.raises(LinkLost):
        run.carry_out()
    assert run.writer.results[0].stopped_by == "link-lost"


def test_the_zero_is_measured_and_kept_before_anything_is_drawn():
    run = Run(PLAN)
    run.carry_out()
    kinds = [kind for _, kind, _, _ in run.writer.events]
    assert kinds.index("zero") < next(
        i for i, (_, _, text, _) in enumerate(run.writer.events) if text.startswith("The load sinks")
    )
    assert "1.20 mA" in run.texts("zero")[0]


def test_the_plans_limits_are_in_force_during_the_run_and_put_back_after_it():
    seen = []
    run = Run(PLAN.replace("[[test]]", "[limits]\ncurrent_A = 2.5\n[[test]]", 1))
    run.instrument.at_frame[MIDWAY] = lambda load: seen.append(load.limits_in_force.current_A)
    run.carry_out()
    assert seen == [2.5]
    assert run.instrument.limits_in_force.current_A == 4.0


def test_an_earlier_fault_is_cleared_and_told():
    run = Run(PLAN)
    run.instrument.fault_code = Fault.HOST_SILENT
    run.carry_out()
    assert "clear" in run.instrument.calls
    assert run.texts("warning")[0].startswith("An earlier fault was cleared")


def test_no_source_is_refused_before_anything_is_drawn():
    run = Run(PLAN)
    run.instrument.source.open_V = 0.0
    with pytest.raises(SinkwrightError, match="no source is seen"):
        run.carry_out()
    assert "on" not in run.instrument.calls


def test_an_open_sense_pair_is_refused_before_anything_is_drawn():
    run = Run(PLAN, force_V=24.0)
    with pytest.raises(SinkwrightError, match="sense pair reads"):
        run.carry_out()
    assert "on" not in run.instrument.calls


def test_an_instruction_waits_for_the_person_with_the_load_off():
    run = Run(SOURCE + HOLD + 'instruction = "Turn the knob to 12 V."\n')
    run.carry_out()
    assert run.progress.asked == ["Turn the knob to 12 V."]
    assert run.texts("instruction")[0] == "The load is off and waits for you. Turn the knob to 12 V."


def test_every_frame_of_the_run_goes_into_the_record():
    run = Run(PLAN)
    run.carry_out()
    numbers = [sample.number for sample in run.writer.samples]
    assert numbers == list(range(1, run.instrument.number + 1))


def test_current_that_flows_after_the_run_is_never_taken_for_off():
    run = Run(SOURCE + HOLD)
    run.carry_out()
    last = run.instrument.number - 1
    run = Run(SOURCE + HOLD, at_frame={last: lambda load: load.trip(Fault.CURRENT_ALTHOUGH_OFF)})
    with pytest.raises(ProtectionTripped, match="pull the source lead now"):
        run.carry_out()
    assert run.writer.results[0].verdict == "none"


def test_the_record_ends_with_the_load_off():
    run = Run(SOURCE + HOLD)
    run.carry_out()
    assert run.writer.samples[-1].state == State.OFF
