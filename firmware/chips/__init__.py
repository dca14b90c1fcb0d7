"""Which driver serves which part, and what the control step expects of every driver.

The name tells: the part that the board file calls X is driven by KIND_x.py in this folder, whose `DRIVER` is made
with what `ON` names of the board (its "bus", its "pins", or "board" for all of it) and with the part's entry in the
board image. So a new chip is one more file here, and its name in the board file.

    dac_*     prepare(clock) -> whether output and power-up value are zero; write(code)
    adc_*     begin(input); finish() -> counts, or NOT_READY, or NOT_CONVERTING with `config_seen`;
              under_way() -> whether a conversion is (left out where nothing can be told about that)
    monitor_* prepare(clock) -> whether the trip is set; tripped() -> whether it holds the gate; rearm(); limit_uA

`write`, `begin`, `finish` and `tripped` allocate nothing; bus errors (OSError) pass through them.
"""

from micropython import const

#: What `finish` returns instead of counts; every true conversion lies above.
NOT_READY = const(-40000)
NOT_CONVERTING = const(-40001)
LOWEST_COUNTS = const(-32768)


def find(kind, part):
    """The driver's module. Raises ImportError for a part that has none."""
    return __import__("chips." + kind + "_" + part.lower(), None, None, ("DRIVER",))


def driver(kind, entry, board):
    """The driver object for `entry` of the image."""
    module = find(kind, entry["part"])
    return module.DRIVER(board if module.ON == "board" else getattr(board, module.ON), entry)
