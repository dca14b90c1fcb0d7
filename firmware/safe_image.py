"""A board image under which nothing can be asked for: what the firmware runs on when its own is no good.

It lets the board say over the link why it stays off. It is also the pattern that a good image is held against:
every name here must be there, with a value of the same kind (see selftest.py).
"""

_SCALE = {"zero_counts": 0, "whole": 1, "part": 0}
_BOUNDS = {"gain_ppm": 0, "zero_counts": 0}
_SINK = {"r_mK_per_W": 1000, "warm": [4096, 7], "cool": [4096, 7]}

SAFE_IMAGE = {
    "image": 1,
    "name": "no board file",
    "board_file_crc": 0,
    "period_us": 2350,
    "dac": {"part": "MCP4725", "address": 0x60, "zero_code": 0, "uA_per_code_x64": 64, "full_code": 4095},
    "adc": {
        "part": "ADS1115",
        "address": 0x48,
        "gain_bits": 1,
        "rate_bits": 7,
        "conversion_us": 1317,
        "inputs": {"current": 0, "voltage": 1, "force": 2, "heatsink": 3},
    },
    "scales": {"current": _SCALE, "voltage": _SCALE, "force": _SCALE},
    "thermistor": {"counts": [0, 32767], "mC": [125000, -20000], "open_counts": 32767, "short_counts": 0},
    "thermal": {"stages": [{"r_mK_per_W": 1, "every_steps": 2, "share_x32768": 1}]},
    "limits": {
        "current_uA": 1,
        "voltage_uV": 60_000_000,
        "power_uW": 1,
        "heatsink_mC": 85_000,
        "junction_mC": 125_000,
        "slew_uA_per_ms": 1,
        "silence_ms": 3_000,
    },
    "zero_budget_uA": 0,
    "off_current_uA": 60_000,
    "demand_margin_uA": 0,
    "hard_counts": {"current": 0, "voltage": 32767, "force": 32767, "heatsink": 0},
    "calibration": {"current": _BOUNDS, "voltage": _BOUNDS, "force": _BOUNDS},
    "sense": {"fixed_uV": 0, "share_x1024": 0, "lead_mohm": 0, "short_mohm": 0},
    "cooling": {
        "most": _SINK,
        "still": _SINK,
        "least": _SINK,
        "drift_uK": 0,
        "allowance_mK": 200_000,
        "coldest_mC": 0,
    },
}
