"""A heatsink for tests of the cooling model, in floating point and not from the firmware: lines for the board.

One heat capacity behind one resistance to the air (as the simulated board has it), a fan that runs from 45 to 40 degC,
a thermistor that may be off by a few per mille of its reading or hang in the air. Each step is exact for its power.
"""

from __future__ import annotations

import json

from sinkwright.board_image import compile_board
from sinkwright.definitions.loading import load_board

SINK = """
        import math
        from cooling import Cooling, FITS, TOO_WARM, TOO_COLD
        # The shipped board's: 0.85 K/W and 180 s.
        K_per_W = 0.85
        J_per_K = 180.0 / 0.85
        STEP_s = 66 * 2.35e-3
        class Sink:
            def __init__(self, resistance=K_per_W, capacity=J_per_K, still=5.0, air=24.0, warm=0.0):
                self.resistance = resistance
                self.capacity = capacity
                self.still = still
                self.air = air
                self.rise = warm
                self.fan = False
                self.fan_dead = False
                self.loose = None
            def step(self, power_W):
                resistance = self.resistance if self.fan and not self.fan_dead else self.resistance * self.still
                share = -math.expm1(-STEP_s / (resistance * self.capacity))
                self.rise += (power_W * resistance - self.rise) * share
                shown = self.air + self.rise
                self.fan = shown > (40.0 if self.fan else 45.0)
                if self.loose is not None:
                    self.loose += (self.air - self.loose) * STEP_s / 15.0
                    shown = self.loose
                return int(shown * 1000.0)
        def watch(cooling, sink, power_at, first_s, last_s):
            "The first second at which something is confirmed, with what it is; else None."
            for step in range(int(first_s / STEP_s), int(last_s / STEP_s)):
                power_W = power_at(step * STEP_s)
                heatsink_mC = sink.step(power_W)
                cooling.step(heatsink_mC, int(power_W * 1000), int(power_W * 1000))
                if cooling.confirmed() != FITS:
                    return [cooling.confirmed(), step * STEP_s, heatsink_mC / 1000, cooling.bound_mC / 1000]
            return None
"""


def shipped_image() -> str:
    """The shipped board's image, as a literal for the lines."""
    return json.dumps(compile_board(load_board())).replace("null", "None").replace("true", "True")
