"""The board's test of itself at each start, with the gate clamped; whatever fails it keeps the load off.

Decides what a good board is: an image with every value in its place and range, a store that can be believed,
chips that answer and do what they are told, a calibration that its parts could need. Each check returns a
sentence about the first thing that is wrong, or an empty one. It must not know the link: main.py tells the code.
"""

from micropython import const

import chips
import wire
from safe_image import SAFE_IMAGE
from scaling import implausible

_IMAGE_VERSION = const(1)
_SCALES = ("current", "voltage", "force")
_PART_ONE = const(1 << 14)
_SHARE_ONE = const(1 << 15)
_SLOWEST_STEPS = const(512)
_LARGEST_INTEGER = const((1 << 30) - 1)
_TRIES = const(3)
#: Values that only some parts have: their drivers refuse an image that lacks them.
_OF_ONE_PART = ("address", "gain_bits", "rate_bits")


def run(board, store, dac, adc, monitor):
    """The code of the first check that fails (wire.SELF_TEST_PASSED if none), and the sentence to it."""
    image = board.image
    for code, check in (
        (wire.SELF_TEST_STORE, lambda: check_store(store)),
        (wire.SELF_TEST_CALIBRATION, lambda: check_calibration(store.get("calibration"), image)),
        (wire.SELF_TEST_DAC, lambda: check_dac(dac, board.clock)),
        (wire.SELF_TEST_ADC, lambda: check_adc(adc, board.clock, image["adc"])),
        (wire.SELF_TEST_ADC, lambda: check_monitor(monitor, board.clock)),
    ):
        wrong = check()
        if wrong:
            return code, wrong
    return wire.SELF_TEST_PASSED, ""


def check_image(image):
    """Every name of the pattern, the same kind of value, and the ranges that the arithmetic relies on."""
    return _check_kind(image, SAFE_IMAGE, "board file") or _check_ranges(image) or _check_parts(image)


def check_store(store):
    return "neither slot of the store can be believed" if store.spoiled else ""


def check_calibration(calibration, image):
    """A calibration beyond what parts of this kind can need would disable protection: it is not used."""
    if calibration is None:
        return ""
    if not isinstance(calibration, dict) or not isinstance(calibration.get("number"), int):
        return "the calibration has no number"
    return implausible(calibration, image)


def check_dac(dac, clock):
    try:
        return "" if dac.prepare(clock) else "the DAC does not read back as it was written"
    except OSError as error:
        return "the DAC does not answer: error " + str(error.errno)


def check_adc(adc, clock, entry):
    """Each input in use is converted once."""
    try:
        for name in ("current", "voltage", "force", "heatsink"):
            if not _converts(adc, clock, entry, entry["inputs"][name]):
                return "the ADC does not convert its input for " + name
        return ""
    except OSError as error:
        return "the ADC does not answer: error " + str(error.errno)


def _converts(adc, clock, entry, input_number):
    adc.begin(input_number)
    for _ in range(_TRIES):
        clock.wait_until(clock.add(clock.ticks_us(), entry["conversion_us"]))
        if adc.finish() >= chips.LOWEST_COUNTS:
            return True
    return False


def _check_kind(value, pattern, where):
    if isinstance(pattern, dict):
        if not isinstance(value, dict):
            return where + " is no table"
        for name in pattern:
            if name in _OF_ONE_PART:
                continue
            if name not in value:
                return where + " has no " + name
            wrong = _check_kind(value[name], pattern[name], where + "." + name)
            if wrong:
                return wrong
        return ""
    if isinstance(pattern, list):
        return _check_list(value, pattern[0], where)
    if type(value) is not type(pattern):
        return where + " is of the wrong kind"
    if isinstance(value, int) and not -_LARGEST_INTEGER <= value <= _LARGEST_INTEGER and where[-4:] != "_crc":
        return where + " is too large"
    return ""


def _check_list(value, pattern, where):
    if not isinstance(value, list) or not value:
        return where + " is no list"
    for entry in value:
        wrong = _check_kind(entry, pattern, where)
        if wrong:
            return wrong
    return ""


def _check_ranges(image):
    if image["image"] != _IMAGE_VERSION:
        return "the board file is for another version of the firmware"
    if not 1_000 <= image["period_us"] <= 20_000:
        return "board file.period_us is out of range"
    for table in (image["limits"], {"uA_per_code_x64": image["dac"]["uA_per_code_x64"]}):
        for name in table:
            if table[name] <= 0:
                return "board file." + name + " must be above zero"
    for name in _SCALES:
        scale = image["scales"][name]
        if scale["whole"] < 0 or not 0 <= scale["part"] < _PART_ONE or not scale["whole"] + scale["part"]:
            return "board file.scales." + name + " is out of range"
    return _check_thermistor(image["thermistor"]) or _check_stages(image["thermal"]["stages"])


def check_monitor(monitor, clock):
    """Without its second trip a board that has one does not sink."""
    try:
        if monitor is None or monitor.prepare(clock):
            return ""
        return "the current monitor does not read back as it was written"
    except OSError as error:
        return "the current monitor does not answer: error " + str(error.errno)


def _check_parts(image):
    for kind in ("dac", "adc", "monitor"):
        if kind not in image:
            continue
        try:
            chips.find(kind, image[kind]["part"])
        except ImportError:
            return "board file." + kind + ".part: there is no driver for " + image[kind]["part"]
    return ""


def _check_thermistor(entry):
    counts = entry["counts"]
    if len(counts) != len(entry["mC"]) or len(counts) < 2:
        return "board file.thermistor has columns of different length"
    for at in range(1, len(counts)):
        if counts[at] <= counts[at - 1]:
            return "board file.thermistor.counts do not rise"
    return ""


def _check_stages(stages):
    for stage in stages:
        every = stage["every_steps"]
        if not 2 <= every <= _SLOWEST_STEPS or every & (every - 1):
            return "board file.thermal: every_steps is no power of two from 2 to 512"
        if stage["r_mK_per_W"] <= 0 or not 0 < stage["share_x32768"] <= _SHARE_ONE:
            return "board file.thermal: a stage is out of range"
    return ""
