"""A part's name in the board image finds its driver; nothing else has to know it."""

from __future__ import annotations

import pytest

from tests.firmware.running import on_board


@pytest.mark.parametrize(
    ("kind", "part"), [("dac", "MCP4725"), ("dac", "PWM"), ("adc", "ADS1115"), ("adc", "RP2")]
)
def test_the_part_s_name_finds_its_driver(kind: str, part: str) -> None:
    found = on_board(f"""
        import chips
        found = chips.find("{kind}", "{part}").DRIVER.__name__
    """)
    assert found == part


def test_a_part_without_a_driver_is_told_as_a_mistake_in_the_board_file() -> None:
    found = on_board("""
        import selftest
        image = json.loads(json.dumps(IMAGE))
        image["dac"]["part"] = "MCP4752"
        found = selftest.check_image(image)
    """)
    assert found == "board file.dac.part: there is no driver for MCP4752"
