"""The board image: integers that agree with the exact values, and never leave a 31-bit small integer."""

from __future__ import annotations

import csv
import json
import math
import zlib
from itertools import pairwise
from pathlib import Path
from typing import Any

import msgspec
import pytest
from hypothesis import given
from hypothesis import strategies as st

from sinkwright import thermistor
from sinkwright.board_image import compile_board, main, split
from sinkwright.definitions.board import BoardFile
from sinkwright.definitions.loading import default_board_path, load_board, parse_board

SMALL = 1 << 30
NTC = Path(__file__).parent.parent / "data" / "ntc_10k_3977.csv"


@pytest.fixture(scope="module")
def board() -> BoardFile:
    return load_board()


@pytest.fixture(scope="module")
def image(board: BoardFile) -> dict[str, Any]:
    return compile_board(board)


def reading(scale: dict[str, int], counts: int) -> int:
    """As the firmware computes it (scaling.py); asserts that every intermediate is a small integer."""
    n = counts - scale["zero_counts"]
    steps = (n, n * scale["whole"], n * scale["part"] + (1 << 13))
    result = steps[1] + (steps[2] >> 14)
    assert all(abs(value) < SMALL for value in (*steps, result))
    return result


def interpolated(table: dict[str, Any], counts: int) -> int:
    """As the firmware computes it; asserts that every intermediate is a small integer."""
    low = max(i for i, c in enumerate(table["counts"][:-1]) if c <= counts)
    span = table["counts"][low + 1] - table["counts"][low]
    product = (table["mC"][low + 1] - table["mC"][low]) * (counts - table["counts"][low])
    assert abs(product) < SMALL
    return table["mC"][low] + product // span


def test_the_image_is_json_of_integers_and_texts(image: dict[str, Any]) -> None:
    def leaves(value: Any) -> list[Any]:
        if isinstance(value, dict):
            return [leaf for inner in value.values() for leaf in leaves(inner)]
        return [leaf for inner in value for leaf in leaves(inner)] if isinstance(value, list) else [value]

    assert json.loads(json.dumps(image)) == image
    assert {type(leaf) for leaf in leaves(image)} <= {int, str, type(None)}
    assert all(abs(leaf) < SMALL for leaf in leaves({**image, "board_file_crc": 0}) if isinstance(leaf, int))


def test_the_image_of_the_shipped_board_is_as_worked_out_by_hand(image: dict[str, Any]) -> None:
    """3.3 V / 4096 / 0.625 V/A = 1289.0625 uA a code; 125 uV a count: 200 uA, and 1375 uV through 11:1."""
    assert image["dac"]["uA_per_code_x64"] == 82500
    assert image["dac"]["zero_code"] == 124
    assert image["scales"]["current"] == {"zero_counts": 800, "whole": 200, "part": 0}
    assert image["scales"]["voltage"] == {"zero_counts": 800, "whole": 1375, "part": 0}
    assert image["period_us"] == 2350
    assert (image["adc"]["gain_bits"], image["adc"]["rate_bits"]) == (1, 7)
    assert image["limits"]["slew_uA_per_ms"] == 400_000
    assert image["limits"]["power_uW"] == 40_000_000


def test_the_crc_is_that_of_the_file(board: BoardFile, image: dict[str, Any]) -> None:
    assert image["board_file_crc"] == zlib.crc32(default_board_path().read_bytes())
    assert (
        compile_board(parse_board(board.text + "\n# changed\n"))["board_file_crc"] != image["board_file_crc"]
    )


@given(st.floats(1.0, 32767.0), st.integers(0, 8000), st.integers(0, 32767))
def test_a_scale_agrees_with_the_exact_within_half_a_count(per_count: float, zero: int, counts: int) -> None:
    scale = {"zero_counts": zero, **split(per_count)}
    assert 0 <= scale["part"] < 1 << 14
    exact = (counts - zero) * per_count
    # 1 unit from the part and half a unit from the shift: half a count, where a count is 3 units or more
    assert abs(reading(scale, counts) - exact) <= max(per_count / 2, 1.5)


@given(st.integers(0, 32767), st.sampled_from(["current", "voltage", "force"]))
def test_the_shipped_scales_agree_within_half_a_count(counts: int, name: str) -> None:
    board = load_board()
    scale = compile_board(board)["scales"][name]
    sense = getattr(board, f"{name}_sense")
    factor = board.adc.count_V * 1e6 * (1 / sense.V_per_A if name == "current" else sense.ratio)
    exact = (counts - sense.pedestal_V / board.adc.count_V) * factor
    assert abs(reading(scale, counts) - exact) <= factor / 2


@given(st.floats(0.005, 0.5), st.floats(5.0, 100.0), st.floats(2.7, 5.5))
def test_every_accepted_board_keeps_the_demand_in_small_integers(
    ohm: float, gain: float, reference_V: float
) -> None:
    board = load_board()
    try:
        changed = msgspec.structs.replace(
            board,
            current_sense=msgspec.structs.replace(
                board.current_sense, resistance_ohm=ohm, amplifier_gain=gain
            ),
            dac=msgspec.structs.replace(board.dac, reference_V=reference_V),
            limits=msgspec.structs.replace(board.limits, current_A=0.5),
        )
    except ValueError:
        return
    dac = compile_board(changed)["dac"]
    step = dac["uA_per_code_x64"]
    assert dac["full_code"] * step + (step >> 1) < SMALL
    exact = changed.dac.code_V / changed.current_sense.V_per_A * 1e6
    # the reference's own tolerance is 0.2 %; what the rounding adds at full scale stays far below one code
    assert dac["full_code"] * abs(step / 64 - exact) < exact
    assert abs(dac["zero_code"] - changed.current_sense.pedestal_V / changed.dac.code_V) <= 0.5


def test_the_thermistor_table_follows_the_datasheet_curve(image: dict[str, Any]) -> None:
    """Within 0.05 K at every count from -20 to 125 degC; NTCLE100E3 curve (Vishay doc 29049)."""
    table = image["thermistor"]
    worst_K = 0.0
    for counts in range(table["counts"][0], table["counts"][-1]):
        ohm = thermistor.divider_resistance(counts * 4.096 / 32768 / 3.3, 10_000)
        exact = thermistor.temperature_degC(ohm, r25_ohm=10_000, curve="NTCLE100E3-3977")
        if -20 <= exact <= 125:
            worst_K = max(worst_K, abs(interpolated(table, counts) / 1000 - exact))
    assert worst_K < 0.05


def test_the_thermistor_table_gives_the_rows_of_the_data_file(image: dict[str, Any]) -> None:
    """The divider's own resolution is one count, up to 0.05 K at the hot end."""
    for row in csv.DictReader(NTC.read_text(encoding="utf-8").splitlines()[1:]):
        degC, ohm = float(row["t_degC"]), float(row["r_ohm"])
        if -20 <= degC <= 125:
            counts = round(3.3 * ohm / (ohm + 10_000) / 4.096 * 32768)
            assert interpolated(image["thermistor"], counts) / 1000 == pytest.approx(degC, abs=0.08)


def test_open_and_short_lie_beyond_what_a_heatsink_can_be(image: dict[str, Any]) -> None:
    table = image["thermistor"]
    full = 3.3 / 4.096 * 32768
    assert table["counts"] == sorted(set(table["counts"])) and len(table["counts"]) == len(table["mC"]) <= 64
    assert table["open_counts"] >= table["counts"][-1] and table["mC"][-1] <= -39_000
    assert table["short_counts"] <= table["counts"][0] and table["mC"][0] >= 149_000
    # an open thermistor reads the supply; even with every tolerance against it, it is told from the coldest
    assert table["open_counts"] < full * (1 - 0.002 - 0.0015) - 10


@pytest.mark.parametrize(
    ("pullup_ohm", "r25_ohm"), [(2_000, 10_000), (4_700, 10_000), (10_000, 10_000), (100_000, 100_000)]
)
def test_other_dividers_make_a_table_too(pullup_ohm: float, r25_ohm: float) -> None:
    table = thermistor.divider_table(26_400, pullup_ohm, r25_ohm=r25_ohm, curve=None, beta_K=3950)
    assert len(table) <= thermistor.TABLE_POINTS
    for (low, low_mC), (high, high_mC) in pairwise(table):
        assert 0 < high - low < 1 << 12 and 0 < low_mC - high_mC < 1 << 17
        assert (low_mC - high_mC) * (high - low) < SMALL


def test_the_stages_stop_at_the_sensor_and_end_where_the_datasheet_says(image: dict[str, Any]) -> None:
    stages = image["thermal"]["stages"]
    assert [stage["r_mK_per_W"] for stage in stages] == [150, 350, 200, 300]
    for stage, time_s in zip(stages, (0.001, 0.03, 0.15, 0.5), strict=True):
        exact = 32768 * (1 - math.exp(-stage["every_steps"] * 0.00235 / time_s))
        assert stage["share_x32768"] == pytest.approx(exact, abs=0.5)


@pytest.mark.parametrize("base", [1.5, 2.0, 4.0, 8.0, 15.0])
def test_slow_stages_share_the_firmwares_turns(board: BoardFile, base: float) -> None:
    """thermal.py gives a turn in 256 to at most one slow stage; powers of two that double always fit."""
    stages = tuple((0.05, 0.001 * base**n) for n in range(6))
    transistor = msgspec.structs.replace(board.transistor, stages=stages, case_to_sink_s=100.0)
    compiled = compile_board(msgspec.structs.replace(board, transistor=transistor))["thermal"]["stages"]
    every = [stage["every_steps"] for stage in compiled]
    assert len(every) == 7 and every[0] == 2 and every == sorted(every)
    assert all(n & (n - 1) == 0 and n <= 512 for n in every)
    assert sum(2 / n for n in every if n > 2) <= 1
    assert all(stage["share_x32768"] > 0 for stage in compiled)


def test_the_bands_of_the_guard_are_ordered(image: dict[str, Any]) -> None:
    assert 0 < image["zero_budget_uA"] < image["off_current_uA"] < image["limits"]["current_uA"]
    assert image["demand_margin_uA"] == 150_000
    assert image["zero_budget_uA"] == 13_840


def test_the_module_prints_the_image_of_a_board_file(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    board = tmp_path / "my-board.toml"
    board.write_text(default_board_path().read_text(encoding="utf-8"), encoding="utf-8")
    assert main([str(board)]) == 0
    assert json.loads(capsys.readouterr().out) == compile_board(load_board(board))


def test_the_module_says_what_is_wrong_with_a_board_file(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    (tmp_path / "bad.toml").write_text("name = 3", encoding="utf-8")
    assert main([str(tmp_path / "bad.toml")]) == 2
    told = capsys.readouterr()
    assert told.out == ""
    assert "bad.toml" in told.err
