"""Carries out cases, each a plain dict, on the true firmware in one interpreter; see test_modes_on_sources.py.

Every case says `source`, `mode`, `value` and `settle_s`; what else it may say stands in `carry_out`.
"""

import gc
import json
import sys

from loaded_source import Loaded

_MEAN_s = 0.2


def carry_out(image, case):
    """(V, A) as read at the end, the largest current that truly flowed, and what the board said."""
    gc.collect()
    loaded = Loaded(image, case["source"], defects=case.get("defects", ()))
    loaded.sink(case["mode"], case["value"])
    loaded.run_s(case["settle_s"])
    found = {
        "first_A": loaded.mean(0.1)[1],
        "first_limiting": loaded.limiting(),
        "first_peak_A": loaded.peak_A,
    }
    if "then" in case:
        loaded.peak_A = 0.0
        loaded.ask(*case["then"])
        loaded.run_s(case["settle_s"])
    if "away_s" in case:
        loaded.peak_A = 0.0
        loaded.run_s(case["away_s"])
        found["away_limiting"] = loaded.limiting()
        found["away_clamped"] = loaded.firmware.machine.held
        loaded.run_s(1.0)
    volt, ampere = loaded.mean(_MEAN_s)
    lowest_V, highest_V = _extremes(loaded, case.get("watch_s", 0.0))
    found["voltage_V"] = volt
    found["current_A"] = ampere
    found["lowest_V"] = lowest_V
    found["highest_V"] = highest_V
    found["peak_A"] = loaded.peak_A
    found["limiting"] = loaded.limiting()
    found["fault"] = loaded.fault()
    return found


def _extremes(loaded, seconds):
    window = loaded.firmware.meter.telemetry
    window.restart()
    if seconds:
        loaded.run_s(seconds)
    return window.voltage_min_uV * 1e-6, window.voltage_max_uV * 1e-6


def main():
    """Image and cases come as two lines of JSON; the findings go back as one."""
    image = json.loads(sys.stdin.readline())
    cases = json.loads(sys.stdin.readline())
    sys.stdout.write(json.dumps([carry_out(image, case) for case in cases]) + "\n")
