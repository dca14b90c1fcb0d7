"""Which converters a board file may name, and what they need beside their name."""

from __future__ import annotations

import pytest

from sinkwright.board_image import compile_board
from sinkwright.definitions.loading import parse_board
from sinkwright.definitions.parts import driven_parts
from sinkwright.firmware_files import find_firmware
from sinkwright.templates import template

from .refusing import refusal

SHIPPED = template("board")
MONITOR = "[monitor]\nshunt_ohm = 0.01\nalert_pin = 21\n\n[current_sense]\n"


def changed(*replacements: tuple[str, str]) -> str:
    text = SHIPPED
    for old, new in replacements:
        assert text.count(old) == 1, old
        text = text.replace(old, new)
    return text


PWM = ('part = "MCP4725" ', 'pin = 10\npart = "PWM" ')
RP2 = ('part = "ADS1115" ', 'part = "RP2" ')
RANGE = ("range_V = 4.096", "range_V = 3.3")
WITH_MONITOR = ("[current_sense]\n", MONITOR)


def test_a_part_may_be_named_when_the_firmware_has_its_file() -> None:
    for kind in ("dac", "adc", "monitor"):
        for part in driven_parts(kind):
            assert (find_firmware() / "chips" / f"{kind}_{part.lower()}.py").is_file()
    assert {"MCP4725", "PWM"} <= set(driven_parts("dac"))
    assert {"ADS1115", "RP2"} <= set(driven_parts("adc"))


@pytest.mark.parametrize(
    ("replacements", "key", "right"),
    [
        ([('part = "MCP4725" ', 'part = "PWM" ')], "dac.pin", "number of its GPIO"),
        ([('part = "MCP4725" ', 'pin = 10\npart = "MCP4725" ')], "dac.pin", "a chip none"),
        ([('part = "MCP4725" ', 'pin = 15\npart = "PWM" ')], "dac.pin", "its own"),
        ([('part = "MCP4725" ', 'pin = 26\npart = "PWM" '), RP2, RANGE], "adc.inputs", "its own"),
        ([RP2], "adc.range_V", "supply_V"),
        ([('part = "ADS1115" ', 'part = "ADS1114" ')], "adc.part", "ADS1115"),
        ([("[current_sense]\n", MONITOR.replace("0.01", "0.05"))], "monitor.shunt_ohm", "at most 0.0182"),
        ([("[current_sense]\n", MONITOR.replace("21", "15"))], "monitor.alert_pin", "its own"),
        (
            [("[current_sense]\n", MONITOR.replace("]\n", "]\naddress = 0x48\n", 1))],
            "monitor.address",
            "its own",
        ),
    ],
)
def test_what_a_part_lacks_is_named(replacements: list[tuple[str, str]], key: str, right: str) -> None:
    error = refusal(parse_board, changed(*replacements))
    assert error.where.endswith(key)
    assert right in error.remedy


def test_the_image_tells_what_the_drivers_need() -> None:
    image = compile_board(parse_board(changed(PWM, RP2, RANGE, WITH_MONITOR)))
    assert (image["dac"]["part"], image["dac"]["pin"], image["dac"]["frequency_Hz"]) == ("PWM", 10, 30_518)
    assert image["adc"]["part"] == "RP2"
    # 4 A and an eighth, through 10 mohm, in 2.5 uV.
    assert image["monitor"] == {
        "part": "INA226",
        "address": 0x40,
        "pin": 21,
        "limit_uA": 4_500_000,
        "limit_counts": 18_000,
    }


def test_a_board_without_them_has_nothing_of_them_in_its_image() -> None:
    image = compile_board(parse_board(SHIPPED))
    assert "monitor" not in image
    assert "pin" not in image["dac"]
