"""Board files: the shipped one, its defaults, and every check of what must hold together."""

from __future__ import annotations

import re
from pathlib import Path

import pytest

from sinkwright.definitions.board import BoardFile
from sinkwright.definitions.loading import default_board_path, load_board, parse_board
from sinkwright.errors import FileError
from tests.host.definitions.refusing import refusal

SHIPPED = default_board_path().read_text(encoding="utf-8")


def changed(**changes: str) -> str:
    """The shipped board file with `table__key="value"` changed, or `key=` at top level."""
    text = SHIPPED
    for name, value in changes.items():
        *path, key = name.split("__")
        heading = f"[{'.'.join(path)}]" if path else ""
        start = text.index(heading) if heading else 0
        body, count = re.subn(
            rf"^{key} = [^#\n]*", f"{key} = {value} ", text[start:], count=1, flags=re.MULTILINE
        )
        assert count == 1, name
        text = text[:start] + body
    return text


def refused(**changes: str) -> FileError:
    return refusal(lambda text: parse_board(text, where="board.toml"), changed(**changes))


def test_the_shipped_board_holds_together() -> None:
    board = load_board()
    assert isinstance(board, BoardFile)
    assert (board.limits.voltage_V, board.limits.current_A, board.limits.power_W) == (30.0, 4.0, 40.0)
    assert board.current_sense.V_per_A == pytest.approx(0.625)
    assert board.text == SHIPPED


def test_the_shipped_board_spells_out_nearly_every_default() -> None:
    """What a person may change should be seen; only bands that follow from tolerances are left out."""
    board = load_board()
    written = set(re.findall(r"^([A-Za-z]\w*) =", SHIPPED, flags=re.MULTILINE))
    for table in ("limits", "control", "i2c", "dac", "adc", "current_sense", "voltage_sense", "force_sense"):
        keys = set(getattr(board, table).__struct_fields__) - {"inputs"}
        assert keys <= written, table


def test_the_zero_budget_is_the_sum_of_the_tolerances() -> None:
    """(0.1 V * (5 + 0.15) % + 0.1 mV * 25 + (3 + 4*1 + 1) counts * 125 uV) / 0.625 V/A: 13.84 mA by hand."""
    assert load_board().zero_budget_A == pytest.approx((0.00515 + 0.0025 + 0.001) / 0.625)


def test_bands_that_are_not_given_follow_from_the_limits() -> None:
    board = parse_board(re.sub(r"^(off_current_A|demand_margin_A).*$", "", SHIPPED, flags=re.MULTILINE))
    assert board.off_current_A == pytest.approx(board.zero_budget_A + 0.04)
    assert board.demand_margin_A == pytest.approx(0.12 + 20 * 3.3 / 4096 / 0.625)


@pytest.mark.parametrize(
    ("changes", "key", "right"),
    [
        ({"name": '"a-board-with-a-long-name"'}, "name", "16"),
        ({"name": '"ééééééééé"'}, "name", "16"),
        ({"limits__current_A": "6.0"}, "limits.current_A", "lower it to"),
        ({"adc__range_V": "2.048"}, "limits.current_A", "lower it to"),
        ({"limits__voltage_V": "40.0"}, "voltage_sense.ratio", "at least 12.6"),
        ({"limits__power_W": "60.0"}, "limits.power_W", "lower it to 42.5 W"),
        ({"heatsink__ambient_degC": "55"}, "limits.power_W", "lower it to 30 W"),
        ({"heatsink__K_per_W": "1.6"}, "limits.power_W", "lower it to 28.1 W"),
        ({"control__period_s": "0.0015"}, "control.period_s", "at least 0.0017"),
        ({"control__period_s": "0.005"}, "control.period_s", "0.00235"),
        ({"i2c__frequency_Hz": "100000"}, "control.period_s", "faster bus"),
        ({"pins__fan": "15"}, "pins.fan", "its own"),
        ({"i2c__scl": "4"}, "i2c.scl", "its own"),
        ({"adc__address": "0x60"}, "adc.address", "its own"),
        ({"adc.inputs__force": "1"}, "adc.inputs.force", "its own"),
        ({"adc__range_V": "4.0"}, "adc.range_V", "4.096"),
        ({"adc__samples_per_s": "500"}, "adc.samples_per_s", "475"),
        ({"current_sense__amplifier_offset_V": "0.004"}, "current_sense.pedestal_V", "more than 0.106"),
        ({"thermistor.heatsink__pullup_ohm": "1000000"}, "thermistor.heatsink.pullup_ohm", "near 10000"),
        ({"thermistor.heatsink__pullup_ohm": "500"}, "thermistor.heatsink.pullup_ohm", "near 10000"),
        ({"thermistor.heatsink__supply_V": "5.0"}, "thermistor.heatsink.supply_V", "supply"),
        ({"transistor__stages": "[[0.5, 30.0]]"}, "transistor.stages", "transient curve"),
        ({"transistor__stages": "[]"}, "transistor.stages", "1 to 6"),
        ({"protection__off_current_A": "0.01"}, "protection.off_current_A", "more"),
        ({"protection__demand_margin_A": "4.5"}, "protection", "smaller"),
        ({"dac__part": '"MCP4726"'}, "dac.part", "MCP4725"),
        ({"current_sense__resistance_ohm": '"25 mohm"'}, "current_sense.resistance_ohm", "0.025"),
    ],
)
def test_what_does_not_hold_is_refused_with_what_would(changes: dict[str, str], key: str, right: str) -> None:
    error = refused(**changes)
    assert error.where == f"board.toml, {key}"
    assert right.lower() in error.remedy.lower()


@pytest.mark.parametrize(
    "changes",
    [
        {"limits__current_A": "6.0"},
        {"limits__power_W": "60.0"},
        {"heatsink__K_per_W": "1.6"},
        {"control__period_s": "0.0015"},
        {"current_sense__amplifier_offset_V": "0.004"},
    ],
)
def test_the_value_that_is_offered_is_accepted(changes: dict[str, str]) -> None:
    error = refused(**changes)
    table, key = error.where.removeprefix("board.toml, ").split(".")
    found = re.search(r"(?:lower it to|at least|more than) ([\d.]+)", error.remedy.lower())
    assert found, error.remedy
    offered = float(found[1]) * (1.001 if "more than" in error.remedy else 1)
    try:
        parse_board(changed(**{**changes, f"{table}__{key}": f"{offered!r}"}))
    except FileError as next_error:
        assert next_error.where != error.where, str(next_error)


def test_a_thermistor_has_a_curve_or_a_beta() -> None:
    both = refusal(parse_board, SHIPPED.replace('curve = "', 'beta_K = 3977\ncurve = "'))
    assert both.where.endswith("thermistor.heatsink.curve")
    neither = refusal(parse_board, re.sub(r"^curve = .*$", "", SHIPPED, flags=re.MULTILINE))
    assert "is missing" in neither.what
    beta = re.sub(r"^curve = .*$", "beta_K = 3977", SHIPPED, flags=re.MULTILINE)
    assert parse_board(beta).thermistor.heatsink.beta_K == 3977


def test_a_board_without_fan_trigger_and_button_is_a_board() -> None:
    text = re.sub(r"^(fan|trigger|off_button) =.*$", "", SHIPPED, flags=re.MULTILINE)
    assert parse_board(text).pins.fan is None


def test_a_missing_table_is_asked_for_as_a_table(tmp_path: Path) -> None:
    path = tmp_path / "board.toml"
    path.write_text(SHIPPED.replace("[heatsink]", "[heat_sink]"), encoding="utf-8")
    with pytest.raises(FileError) as raised:
        load_board(path)
    assert raised.value.remedy == "Did you mean heatsink?"
    path.write_text('name = "x"\n', encoding="utf-8")
    with pytest.raises(FileError, match=r"limits: it is missing.*\[limits\]"):
        load_board(path)


@pytest.mark.parametrize(
    ("change", "key", "told"),
    [
        ({"current_sense__amplifier_gain": "8.5"}, "current_sense.amplifier_gain", "12 A"),
        ({"voltage_sense__ratio": "20.0"}, "voltage_sense.ratio", "80 V"),
        ({"force_sense__ratio": "20.0"}, "force_sense.ratio", "80 V"),
    ],
)
def test_a_front_end_that_spans_more_than_the_firmware_holds_is_refused(
    change: dict[str, str], key: str, told: str
) -> None:
    """The same bounds as firmware/meter.py, where such a board would refuse to boot."""
    with pytest.raises(FileError) as refused:
        parse_board(changed(**change))
    assert key in str(refused.value)
    assert told in str(refused.value)
