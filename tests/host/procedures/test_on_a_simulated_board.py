"""The procedures on the true firmware and simulated sources whose true figures are known.

Oracle: Ohm's law, V = Voc - I * Rs, and the limits in the source files themselves. Every figure must lie
within the uncertainty stated for it, on boards whose parts err differently (seeds).
"""

from __future__ import annotations

import asyncio
from pathlib import Path
from typing import Any

import pytest

from sinkwright.definitions.loading import load_board, parse_plan
from sinkwright.instrument import Instrument
from sinkwright.procedures.runner import run_plan
from sinkwright.results import RunResult
from sinkwright.stopping import StopRequest
from tests.host.procedures.carrying_out import Listening, within
from tests.support.fake_instrument import FakeWriter

PLAN = "[source]\nrated_voltage_V = 12.0\nrated_current_A = 2.0\n"
REGULATION = '[[test]]\nkind = "load-regulation"\n'
LIMIT = '[[test]]\nkind = "current-limit"\nup_to_A = 3.0\n'


def measured(folder: Path, source: str, plan: str, seed: int = 1) -> RunResult:
    path = folder / "source.toml"
    path.write_text(source)
    writer: Any = FakeWriter()

    async def run() -> RunResult:
        async with await Instrument.open(f"sim:{path},speed=max,seed={seed}") as load:
            text = parse_plan(plan, "plan")
            return await run_plan(load, text, load_board(), writer, Listening(), StopRequest())

    return asyncio.run(run())


def supply(voltage_V: float = 12.1, resistance_ohm: float = 0.045, more: str = "") -> str:
    return f'kind = "supply"\nvoltage_V = {voltage_V}\nresistance_ohm = {resistance_ohm}\n{more}'


@pytest.mark.parametrize("seed", [1, 2, 3])
@pytest.mark.parametrize(("voltage_V", "resistance_ohm"), [(5.05, 0.05), (12.1, 0.045), (18.0, 1.0)])
def test_open_voltage_and_resistance_of_a_thevenin_source_are_recovered(
    tmp_path, voltage_V, resistance_ohm, seed
):
    plan = PLAN.replace("12.0", str(voltage_V)) + REGULATION
    (test,) = measured(tmp_path, supply(voltage_V, resistance_ohm), plan, seed).tests
    full_V = voltage_V - 2.0 * resistance_ohm
    assert within(test.quantities["no_load_voltage_V"], voltage_V)
    assert within(test.quantities["output_resistance_ohm"], resistance_ohm)
    # The current is 2 A only within its own uncertainty (1.1 %), which moves the full-load point with it.
    regulation = test.quantities["load_regulation_percent"]
    true = (voltage_V - full_V) / full_V * 100
    assert abs(regulation.value - true) <= regulation.expanded_uncertainty + 0.015 * true


def test_the_resistance_of_a_resistive_source_is_found_by_ohms_law(tmp_path):
    # A static characteristic that is a straight line: 10 V open, 2.5 A shorted, so 4 ohm.
    source = 'kind = "curve"\npoints = [[0.0, 2.5], [10.0, 0.0]]\n'
    plan = "[source]\nrated_voltage_V = 10.0\n" + REGULATION + "full_load_current_A = 1.0\n"
    (test,) = measured(tmp_path, source, plan).tests
    assert within(test.quantities["output_resistance_ohm"], 4.0)


@pytest.mark.parametrize("seed", [1, 2])
@pytest.mark.parametrize(
    ("limit", "shorted_A", "note"),
    [
        ('limit_kind = "constant"\ncapacitance_F = 470e-6\n', 2.5, "back in its band at 2."),
        ('limit_kind = "foldback"\nfoldback_A = 0.8\ncapacitance_F = 470e-6\n', 0.8, "folds back"),
        ('limit_kind = "latch"\n', 0.0, "switches off at its limit"),
    ],
)
def test_each_kind_of_current_limit_is_found_and_told(tmp_path, limit, shorted_A, note, seed):
    source = supply(more="limit_A = 2.5\n" + limit)
    (test,) = measured(tmp_path, source, PLAN + LIMIT, seed).tests
    # At the knee the output has fallen by I * Rs, and a foldback's limit with it: 0.8 + 1.7 * 11.99 / 12.1.
    knee_A = 2.484 if "foldback" in limit else 2.5
    assert within(test.quantities["current_limit_A"], knee_A)
    # Between no voltage and the load's own floor of some 0.2 V a foldback gives a little more than its end.
    shorted = test.quantities["short_circuit_current_A"]
    assert abs(shorted.value - shorted_A) <= shorted.expanded_uncertainty + 0.03
    assert any(note in text for text in test.notes)


def test_two_wire_leads_are_corrected_within_their_uncertainty(tmp_path):
    source = supply(more="leads_ohm = 0.08\nremote_sense = false\n")
    leads = 'sense = "two-wire"\nlead_resistance_ohm = 0.078\nlead_resistance_uncertainty_ohm = 0.004\n'
    (test,) = measured(tmp_path, source, PLAN + leads + REGULATION).tests
    assert within(test.quantities["output_resistance_ohm"], 0.045)
    assert within(test.quantities["full_load_voltage_V"], 12.01)


def test_a_sense_pair_makes_the_leads_irrelevant(tmp_path):
    source = supply(more="leads_ohm = 0.08\n")
    (test,) = measured(tmp_path, source, PLAN + REGULATION).tests
    assert within(test.quantities["output_resistance_ohm"], 0.045)


def test_a_cell_is_drained_to_its_end_voltage_and_its_charge_counted(tmp_path):
    # 3.0 V under 0.5 A is reached at an open voltage of 3.0 + 0.5 * (0.030 + 0.015) V, with 2.45 % left.
    source = (
        'kind = "cell"\ncapacity_Ah = 0.02\nstate_of_charge = 1.0\nr0_ohm = 0.03\nrc = [[0.015, 2000.0]]\n'
        "ocv = [[0.0, 2.9], [0.1, 3.4], [0.5, 3.7], [1.0, 4.18]]\n"
    )
    plan = '[[test]]\nkind = "hold"\ncurrent_A = 0.5\nend_voltage_V = 3.0\nend_charge_Ah = 0.1\n'
    (test,) = measured(tmp_path, source, plan).tests
    assert test.stopped_by == "end_voltage_V"
    # The end comes earlier or later by the voltage's own uncertainty of 0.06 V: 1.2 % of the charge here.
    capacity = test.quantities["capacity_Ah"]
    assert abs(capacity.value - 0.02 * (1 - 0.0245)) <= capacity.expanded_uncertainty + 0.02 * 0.012


@pytest.mark.parametrize(
    ("setpoint", "current_A"),
    [
        # V = (12 + sqrt(12^2 - 4*0.5*20)) / 2, I = 12 / (6 + 0.5), I = (12 - 11.2) / 0.5
        ("power_W = 20.0\n", 1.80196),
        ("resistance_ohm = 6.0\n", 1.84615),
        ("voltage_V = 11.2\n", 1.6),
    ],
)
def test_a_hold_at_power_resistance_or_voltage_meets_the_load_line(tmp_path, setpoint, current_A):
    plan = (
        "[source]\nrated_voltage_V = 12.0\nrated_current_A = 3.0\n[limits]\ncurrent_A = 3.0\n"
        + '[[test]]\nkind = "hold"\nduration_s = 5.0\n'
        + setpoint
    )
    (test,) = measured(tmp_path, supply(12.0, 0.5), plan).tests
    voltage_V = 12.0 - 0.5 * current_A
    quantities = test.quantities
    key, _, value = setpoint.strip().partition(" = ")
    # What is held is what the board reads, so only what it holds otherwise is known within its uncertainty.
    assert quantities[key].value == pytest.approx(float(value), rel=2e-3)
    assert within(quantities["voltage_V"], voltage_V)
    assert abs(quantities["current_A"].value - current_A) < 0.04 * current_A + (
        0.1 if key == "voltage_V" else 0.0
    )
    assert not any("was not held" in note for note in test.notes)


def test_a_power_that_the_source_cannot_give_is_told_in_words(tmp_path):
    plan = '[source]\nrated_voltage_V = 12.0\n[[test]]\nkind = "hold"\nduration_s = 4.0\npower_W = 12.0\n'
    (test,) = measured(tmp_path, supply(12.0, 4.0), plan).tests
    assert any("more than the source can give" in note for note in test.notes)
    # The most is 12 V squared over 16 ohm: 9 W.
    assert test.quantities["power_W"].value == pytest.approx(9.0, rel=0.05)


def test_a_run_on_a_simulated_board_repeats_to_the_last_digit(tmp_path):
    runs = [measured(tmp_path, supply(), PLAN + REGULATION).to_json() for _ in range(2)]
    assert runs[0] == runs[1]
