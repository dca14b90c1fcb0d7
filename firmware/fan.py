"""When the fan runs: by the heatsink's temperature, with a distance between on and off; always while a fault stands."""

from micropython import const

import wire

#: Above this the fan runs; the model of the cooling (cooling.py) relies on it.
ON_mC = const(45_000)
_OFF_mC = const(40_000)


class Fan:
    """`switch` takes True or False; a board without a fan has one that does nothing."""

    def __init__(self, switch):
        self._switch = switch
        self.on = False
        switch(False)

    def service(self, heatsink_mC, fault):
        """Now and then. After a fault the temperature itself may be what cannot be believed."""
        on = fault != wire.FAULT_NONE or heatsink_mC > (_OFF_mC if self.on else ON_mC)
        if on != self.on:
            self.on = on
            self._switch(on)
