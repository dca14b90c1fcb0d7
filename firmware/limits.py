"""What the load may be asked for and what it trips at, as one set: the board's own, or one in force within it."""


class Limits:
    """What trips, in integers; the names are those of the wire's Limits message."""

    FIELDS = (
        "current_uA",
        "voltage_uV",
        "power_uW",
        "heatsink_mC",
        "junction_mC",
        "slew_uA_per_ms",
        "silence_ms",
    )

    def __init__(self, values):
        for name in self.FIELDS:
            setattr(self, name, values[name])

    def values(self):
        return [getattr(self, name) for name in self.FIELDS]
