"""The board's test of itself at start: each thing that can be wrong, the code that it gets, and the load off."""

from __future__ import annotations

from typing import Any

import pytest

from sinkwright.board_image import compile_board
from sinkwright.definitions import load_board
from tests.firmware.running import on_board

STARTED = """
    import startup
    texts = []
    startup.print = lambda *values: texts.append(" ".join([str(value) for value in values]))
    session = Session(board)
    session.take_control()
    session.ask(wire.SET_POINT, struct.pack(wire.SET_POINT_FORMAT, wire.MODE_CURRENT, 0))
    enable = struct.pack(wire.ENABLE_FORMAT, wire.SILENCE_STOP, 0, 0)
    refused = session.refusal(wire.ENABLE, enable)
    report = list(struct.unpack(wire.FAULT_REPORT_FORMAT, session.ask(wire.GET_FAULT)[1])[:3])
    cleared = session.refusal(wire.CLEAR_FAULT)
    found = [report, refused, cleared, board.gate.released, "".join(texts)]
"""

SELF_TEST, BOARD_IMAGE, CAUSE_STANDS = 17, 20, 8


def started(arrange: str) -> list[Any]:
    return on_board(
        "    board = Board()\n" + "".join(f"    {line}\n" for line in arrange.split("; ")) + STARTED
    )


def test_a_good_board_passes_and_sinks() -> None:
    report, refused, cleared, released, text = started("pass")
    assert report == [0, 0, 0]
    assert refused is None
    assert cleared is None
    assert released
    assert text == ""


FAILURES = {
    "no board file": ("board.image = {}", 1, "board file has no"),
    "no table at all": ("board.image = None", 1, "board file is no table"),
    "a table missing": ("del board.image['scales']", 1, "board file has no scales"),
    "a calibration that is no table": (
        "from store import Store; board.led.state = 0; Store(board.store, board.led).put('calibration', [1])",
        5,
        "the calibration has no number",
    ),
    "a wrong kind": ("board.image['period_us'] = '2350'", 1, "board file.period_us is of the wrong kind"),
    "a period out of range": ("board.image['period_us'] = 100", 1, "period_us is out of range"),
    "another version": ("board.image['image'] = 2", 1, "another version"),
    "an integer too large": ("board.image['off_current_uA'] = 1 << 30", 1, "off_current_uA is too large"),
    "a limit of nothing": (
        "board.image['limits'] = dict(board.image['limits']); board.image['limits']['power_uW'] = 0",
        1,
        "power_uW must be above zero",
    ),
    "a scale beyond the meter": (
        "scale = {'zero_counts': 0, 'whole': 16000, 'part': 0}; "
        "board.image['scales'] = {'current': scale, 'voltage': scale, 'force': scale}",
        1,
        "nothing can be made of the board file",
    ),
    "a thermistor table that falls": (
        "board.image['thermistor'] = dict(board.image['thermistor']); "
        "board.image['thermistor']['counts'] = [9, 8, 7, 6, 5]",
        1,
        "counts do not rise",
    ),
    "a thermal stage at an odd rate": (
        "board.image['thermal'] = {'stages': [{'r_mK_per_W': 1, 'every_steps': 3, 'share_x32768': 9}]}",
        1,
        "no power of two",
    ),
    "both slots spoiled": ("board.store.slots = [b'rubbish', b'rubbish']", 2, "neither slot"),
    "a store that keeps nothing": ("board.store.write = lambda slot, data: None", 2, "cannot be written"),
    "no ADC": ("board.bus.silent = 0x48", 3, "the ADC does not answer: error"),
    "an ADC that never is ready": ("board.bus.ready = False", 3, "does not convert its input for current"),
    "an ADC that converts something else": ("board.bus.converting = False", 3, "does not convert its input"),
    "no DAC": ("board.bus.silent = 0x60", 4, "the DAC does not answer: error"),
    "a DAC that keeps its output": (
        "board.bus.code = 0x800; board.bus.writeto = lambda address, data: None",
        4,
        "does not read back",
    ),
}


@pytest.mark.parametrize("name", FAILURES)
def test_what_is_wrong_is_told_by_code_and_in_words_and_the_load_stays_off(name: str) -> None:
    arrange, code, words = FAILURES[name]
    report, refused, cleared, released, text = started(arrange)
    assert report == [SELF_TEST, 1, code]
    assert refused == [BOARD_IMAGE, 0, code]
    assert cleared == [CAUSE_STANDS, 0, SELF_TEST]
    assert released is False
    assert text.startswith("self-test: ")
    assert words in text


CALIBRATION = (
    "scale = lambda w, z: {{'zero_counts': z, 'whole': w, 'part': 0, 'offset': 0}}; "
    "calibration = {{'number': 4, 'current': scale(200, 800)}}; "
    "calibration['voltage'] = calibration['force'] = scale(1375, 800); "
    "{change}; "
    "from store import Store; "
    "board.led.state = 0; "
    "Store(board.store, board.led).put('calibration', calibration)"
)


@pytest.mark.parametrize(
    ("change", "words"),
    [
        ("calibration['current'] = scale(220, 800)", "the calibrated gain of current"),
        ("calibration['current'] = scale(0, 800)", "the calibrated gain of current"),
        ("calibration['voltage'] = scale(1375, 1100)", "the calibrated zero of voltage"),
        ("del calibration['force']", "the calibration of force lacks"),
        ("calibration['number'] = 'four'", "the calibration has no number"),
    ],
)
def test_a_calibration_that_the_parts_cannot_need_keeps_the_load_off(change: str, words: str) -> None:
    report, refused, _, released, text = started(CALIBRATION.format(change=change))
    assert report == [SELF_TEST, 1, 5]
    assert refused == [BOARD_IMAGE, 0, 5]
    assert released is False
    assert words in text


def test_a_calibration_within_the_tolerances_passes() -> None:
    change = "calibration['current'] = scale(203, 790)"
    report, refused, *_ = started(CALIBRATION.format(change=change))
    assert report == [0, 0, 0]
    assert refused is None


def test_the_calibration_s_number_is_told_with_the_identity() -> None:
    found = on_board("""
        from store import Store
        session = Session()
        session.firmware.store.put("calibration", {"number": 12})
        found = struct.unpack(wire.IDENTITY_FORMAT, session.ask(wire.IDENTIFY)[1])[2]
    """)
    assert found == 12


def test_a_new_dac_that_wakes_at_mid_scale_is_made_to_wake_at_zero_before_anything_sinks() -> None:
    found = on_board("""
        import main, startup
        board = Board()
        board.bus.code = board.bus.memory = 0x800
        startup.start(board, main.Firmware)
        found = [board.bus.code, board.bus.memory, board.gate.released]
    """)
    assert found == [0, 0, False]


def test_the_pattern_has_every_name_of_a_true_image() -> None:
    """Otherwise a file without it would pass the test, and whoever needs it would fail in the loop."""
    pattern = on_board("""
        from safe_image import SAFE_IMAGE
        found = SAFE_IMAGE
    """)
    image = compile_board(load_board())
    # board.py itself needs these, and makes a board of nothing where they are missing.
    assert set(image) - {"pins", "i2c"} == set(pattern)
    for name, entry in pattern.items():
        if isinstance(entry, dict) and name != "thermal":
            assert set(entry) == set(image[name]), name


def test_the_shipped_image_passes() -> None:
    image = compile_board(load_board())
    found = on_board(f"""
        import selftest
        found = selftest.check_image({image!r})
    """)
    assert found == ""


def test_the_boot_is_counted_and_told_as_the_boot_number() -> None:
    found = on_board("""
        import main, startup
        board = Board()
        found = []
        for _ in range(3):
            startup.start(board, main.Firmware)
            found.append(board.boot_number)
    """)
    assert found == [1, 2, 3]
