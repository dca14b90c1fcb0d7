"""The guard's bands: no board whose parts keep their tolerances trips them, and they are no wider than that needs."""

from __future__ import annotations

import math
from typing import Any

import msgspec
import pytest

from sinkwright.board_image import compile_board
from sinkwright.definitions.board import BoardFile
from sinkwright.definitions.keys import KeyMistake
from sinkwright.definitions.loading import load_board
from sinkwright.guard_image import guard_image, share_of
from sinkwright.simulator.draws import draw_plant

SEEDS = range(200)


@pytest.fixture(scope="module")
def board() -> BoardFile:
    return load_board()


@pytest.fixture(scope="module")
def image(board: BoardFile) -> dict[str, Any]:
    return compile_board(board)


def counts_at(plant: dict[str, Any], name: str, quantity: float) -> float:
    """What the drawn circuit shows: pin = pedestal + offset + quantity / scale, and the converter's own errors."""
    entry, adc = plant[name], plant["adc"]
    if name == "current":
        pin_V = entry["pedestal_V"] + entry["gain"] * (entry["offset_V"] + quantity * entry["resistance_ohm"])
    else:
        pin_V = entry["pedestal_V"] + entry["offset_V"] + quantity / entry["ratio"]
    return min(pin_V, entry["rail_V"]) * adc["gain"] / 4.096 * 32768 + adc["offset_counts"]


@pytest.mark.parametrize(("name", "limit"), [("current", 4.0), ("voltage", 30.0), ("force", 30.0)])
def test_a_healthy_board_at_its_limit_stays_below_the_hard_counts(
    image: dict[str, Any], board: BoardFile, name: str, limit: float
) -> None:
    hard = image["hard_counts"][name]
    most = max(counts_at(draw_plant(board, seed), name, limit) for seed in SEEDS)
    assert most + 4 < hard
    # and a tenth beyond it is too much for any of them
    assert min(counts_at(draw_plant(board, seed), name, 1.2 * limit) for seed in SEEDS) > hard


def test_the_hard_counts_lie_below_where_the_amplifiers_end(image: dict[str, Any], board: BoardFile) -> None:
    """A saturated reading is none: it must trip. The rail is 3.3 V less what an output stage keeps."""
    for name in ("current", "voltage", "force"):
        saturated = min(counts_at(draw_plant(board, seed), name, 1e6) for seed in SEEDS)
        assert image["hard_counts"][name] < saturated


@pytest.mark.parametrize("name", ["current", "voltage", "force"])
def test_what_drawn_parts_need_as_a_calibration_is_within_its_bounds(
    image: dict[str, Any], board: BoardFile, name: str
) -> None:
    bounds, scale = image["calibration"][name], image["scales"][name]
    nominal = scale["whole"] + scale["part"] / 2**14
    gains, zeros = [], []
    for seed in SEEDS:
        plant = draw_plant(board, seed)
        zero = counts_at(plant, name, 0.0)
        per_count = 1e6 / (counts_at(plant, name, 1.0) - zero)
        gains.append(abs(per_count / nominal - 1) * 1e6)
        zeros.append(abs(zero - scale["zero_counts"]))
    assert max(gains) < bounds["gain_ppm"] < 3 * max(gains)
    assert max(zeros) < bounds["zero_counts"] < 3 * max(zeros)


@pytest.mark.parametrize("volt", [0.0, 1.2, 12.0, 30.0])
def test_the_band_of_the_sense_pair_holds_both_dividers_of_every_board(
    image: dict[str, Any], board: BoardFile, volt: float
) -> None:
    sense, scales = image["sense"], image["scales"]
    for seed in SEEDS:
        plant = draw_plant(board, seed)
        voltage_uV, force_uV = (
            (counts_at(plant, name, volt) - scales[name]["zero_counts"]) * scales[name]["whole"]
            for name in ("voltage", "force")
        )
        band_uV = sense["fixed_uV"] + max(voltage_uV, force_uV) / 1024 * sense["share_x1024"]
        assert abs(voltage_uV - force_uV) < band_uV
    # Yet an open pair is told at a single nickel cell.
    assert sense["fixed_uV"] + 1.2e6 / 1024 * sense["share_x1024"] < 0.25e6


def test_the_cooling_is_bounded_from_both_sides(image: dict[str, Any]) -> None:
    """0.85 K/W and 180 s, 30 % either way and 3 % of the power; 155.1 ms from one reading to the next."""
    cooling = image["cooling"]
    assert cooling["most"]["r_mK_per_W"] == pytest.approx(850 * 1.3 * 1.03, abs=1)
    assert cooling["least"]["r_mK_per_W"] == pytest.approx(850 / 1.3 / 1.03, abs=1)
    assert cooling["still"]["r_mK_per_W"] == pytest.approx(4250 * 1.3 * 1.03, abs=1)
    part, shift = cooling["most"]["warm"]
    assert part / 2 ** (15 + shift) == pytest.approx(0.1551 / (180 * 1.03), rel=1e-3)
    part, shift = cooling["least"]["cool"]
    assert part / 2 ** (15 + shift) == pytest.approx(0.1551 / (180 / 1.3 / 1.3 / 1.03), rel=1e-3)
    assert cooling["drift_uK"] == math.ceil(10e6 / 3600 * 0.1551)


def test_without_a_fan_still_air_is_what_the_resistance_is_for(board: BoardFile) -> None:
    fanless = msgspec.structs.replace(board, pins=msgspec.structs.replace(board.pins, fan=None))
    cooling = guard_image(fanless)["cooling"]
    assert cooling["still"] == cooling["most"]


def test_still_air_that_cools_better_than_the_fan_is_refused(board: BoardFile) -> None:
    with pytest.raises(KeyMistake, match="still_air_K_per_W"):
        msgspec.structs.replace(board.heatsink, still_air_K_per_W=0.5)


@pytest.mark.parametrize("exponent", [1e-6, 1e-5, 8.6e-4, 0.01, 0.2])
def test_a_share_is_split_without_losing_a_thousandth(exponent: float) -> None:
    part, shift = share_of(exponent)
    assert 0 < part < 1 << 13
    assert part / 2 ** (15 + shift) == pytest.approx(-math.expm1(-exponent), rel=1e-3)


def test_a_share_too_large_for_the_firmware_is_cut_to_a_quarter() -> None:
    assert share_of(1.0) == [8191, 0]
