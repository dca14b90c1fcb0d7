"""What a person can do about a cause of error, as sentences, the cheapest first.

The order is ours: time costs less than a meter, a meter less than a soldering iron. A remedy that others
bring with their own causes ranks after these.
"""

from __future__ import annotations

MEASURE_LONGER = "Measure for longer: scatter falls with the square root of the time."
CALIBRATE = "Calibrate the board against a meter: removes most of its parts' gains and offsets."
STEADY_ROOM = "Work near 25 °C, or calibrate at the temperature of use."
LET_WARM_UP = (
    "Let the board warm up, and measure the current zero again just before: turn the load off for a second."
)
SMOOTH_SOURCE = "Measure for longer, or smooth the source: the readings hold ripple."
FINER_CONVERTER = "Build with a converter of finer steps, or a smaller range."
BETTER_THERMISTOR = "Fit a thermistor and a pull-up of closer tolerance."

CHEAPEST_FIRST = (
    MEASURE_LONGER,
    SMOOTH_SOURCE,
    LET_WARM_UP,
    STEADY_ROOM,
    CALIBRATE,
    BETTER_THERMISTOR,
    FINER_CONVERTER,
)


def cost(remedy: str) -> int:
    """Rank of a remedy: a smaller number is cheaper."""
    return CHEAPEST_FIRST.index(remedy) if remedy in CHEAPEST_FIRST else len(CHEAPEST_FIRST)
