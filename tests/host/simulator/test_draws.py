"""The parts of a simulated board: within the tolerances of its file, decided by the seed, and by it alone."""

from __future__ import annotations

import json
import math
import subprocess
import sys

import pytest

from sinkwright.definitions import load_board, parse_board, parse_source
from sinkwright.simulator.draws import draw_board_id, draw_plant, source_keys

BOARD = load_board()
SEEDS = range(300)


def values(*keys):
    for seed in SEEDS:
        value = draw_plant(BOARD, seed)
        for key in keys:
            value = value[key]
        yield value


@pytest.mark.parametrize(
    ("keys", "nominal", "tolerance"),
    [
        (("dac", "reference_V"), 3.3, 3.3 * 0.002),
        (("adc", "gain"), 1.0, 0.0015),
        (("adc", "offset_counts"), 0.0, 3.0),
        (("adc", "window"), 1.0, 0.1),
        (("current", "resistance_ohm"), 0.025, 0.00025),
        (("current", "gain"), 25.0, 0.075),
        (("current", "offset_V"), 0.0, 0.0001),
        (("current", "pedestal_V"), 0.1, 0.005),
        (("voltage", "ratio"), 11.0, 0.033),
        (("force", "ratio"), 11.0, 0.22),
        (("thermistor", "pullup_ohm"), 10000.0, 100.0),
    ],
)
def test_every_part_is_spread_evenly_over_its_tolerance(keys, nominal, tolerance):
    """The shipped board's tolerances; a rectangle's standard deviation is half-width / sqrt(3) (GUM 4.3)."""
    errors = [value - nominal for value in values(*keys)]
    assert max(map(abs, errors)) <= tolerance * (1 + 1e-9)
    deviation = math.sqrt(sum(error**2 for error in errors) / len(errors))
    assert deviation == pytest.approx(tolerance / math.sqrt(3), rel=0.12)


def test_the_same_seed_draws_the_same_board_in_another_process():
    script = (
        "import json; from sinkwright.definitions import load_board;"
        "from sinkwright.simulator.draws import draw_plant; print(json.dumps(draw_plant(load_board(), 7)))"
    )
    done = subprocess.run([sys.executable, "-c", script], capture_output=True, text=True, check=True)
    assert json.loads(done.stdout) == json.loads(json.dumps(draw_plant(BOARD, 7)))


def test_different_seeds_draw_different_boards():
    assert len({json.dumps(draw_plant(BOARD, seed)) for seed in SEEDS}) == len(SEEDS)
    assert len({draw_board_id(seed) for seed in SEEDS}) == len(SEEDS)


def test_one_tolerance_changed_leaves_the_other_parts_as_they_were():
    key = "\nratio_tolerance_percent = "
    looser = parse_board(BOARD.text.replace(f"{key}0.3\n", f"{key}0.6\n"))
    before, after = draw_plant(BOARD, 5), draw_plant(looser, 5)
    assert before.pop("voltage") != after.pop("voltage")
    assert before == after


def test_the_straight_line_of_the_dac_bends_within_its_nonlinearity_and_keeps_its_ends():
    for knots in values("dac", "inl"):
        assert knots[0] == [0, 0.0]
        assert knots[-1] == [4095, 0.0]
        assert all(abs(counts) <= BOARD.dac.integral_nonlinearity_counts for _, counts in knots)


def test_the_thermistor_follows_the_curve_of_its_datasheet():
    """NTCLE100E3 (Vishay doc 29049): 10 kohm at 25, 1070.3 ohm at 85 degC, R25 within 2 %."""
    for table in values("thermistor", "table"):
        ohm = dict(table)
        assert ohm[25] == pytest.approx(10000, rel=0.0201)
        assert ohm[85] / ohm[25] == pytest.approx(0.10703, rel=1e-4)


def test_the_amplifiers_rail_gives_the_current_that_was_calculated_for_a_reconnection():
    """44 A peak with 10 V rails and a threshold of 3 V (ngspice 39, 12 V behind 45 mohm)."""
    assert draw_plant(BOARD, 1)["loop"]["rail_A"] == pytest.approx(44.0)


def test_a_source_travels_with_its_kind_and_without_its_text():
    keys = source_keys(parse_source('kind = "curve"\npoints = [[0.0, 0.76], [0.57, 0.0]]\nleads_ohm = 0.02'))
    assert keys["kind"] == "curve"
    assert json.loads(json.dumps(keys))["points"] == [[0.0, 0.76], [0.57, 0.0]]
    assert keys["leads_ohm"] == 0.02
    assert "text" not in keys
