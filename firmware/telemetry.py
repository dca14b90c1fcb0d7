"""What the board says by itself: telemetry frames at the asked rate, and events.

Nothing here waits. A frame that does not fit into the stream's room at this moment is dropped and counted, and
its number is missed, so that the host sees the gap. An event is kept until there is room; of more than a few,
the oldest give way. Runs between control steps and may allocate.
"""

import struct

from micropython import const

import wire

_EVENTS_KEPT = const(8)
_NONE = const(0)
#: What a person should know of when it begins and when it is over.
_SHORT = (
    wire.LIMITING_SOURCE,
    wire.LIMITING_NO_SOURCE,
    wire.LIMITING_UNREACHABLE,
    wire.LIMITING_UNSETTLED,
)


class Telemetry:
    def __init__(self, link, machine, guard, control, meter, timekeeper):
        self._link = link
        self._machine = machine
        self._guard = guard
        self._control = control
        self._meter = meter
        self._time = timekeeper
        self.every_steps = 0
        self._steps = 0
        self._number = 0
        self._event_number = 0
        self._events = []
        self._limiting_told = wire.LIMITING_NONE
        self.dropped = 0

    def ask(self, every_steps):
        self.every_steps = every_steps
        self._steps = 0
        self._meter.telemetry.restart()

    def service(self):
        """Once after each control step."""
        if self._guard.news:
            self._guard.news = False
            self.tell(wire.EVENT_FAULT, self._guard.fault, self._guard.value, self._guard.limit)
        if self._control.limiting != self._limiting_told:
            self._tell_limiting()
        if self._events:
            self._send_events()
        if self.every_steps:
            self._steps += 1
            if self._steps >= self.every_steps and self._meter.telemetry.pairs:
                self._steps = 0
                self._send_frame()

    def tell(self, kind, code=_NONE, value=_NONE, limit=_NONE):
        """Queue one event, stamped with the board's time."""
        self._event_number += 1
        if len(self._events) == _EVENTS_KEPT:
            self._events.pop(0)
            self.dropped += 1
        self._events.append(
            struct.pack(wire.EVENT_FORMAT, self._event_number, self._time.now_us(), kind, code, value, limit)
        )

    def _tell_limiting(self):
        limiting = self._control.limiting
        if limiting == wire.LIMITING_RAMPING:
            # On its way, but not there: what was told before stands until it is.
            return
        was_short = self._limiting_told in _SHORT
        self._limiting_told = limiting
        if limiting in _SHORT:
            self.tell(wire.EVENT_SOURCE_LIMITS, limiting, self._meter.current_uA, self._control.demand_uA)
        elif was_short:
            self.tell(wire.EVENT_SOURCE_RETURNED, limiting, self._meter.current_uA, self._control.demand_uA)

    def _send_events(self):
        while self._events and self._link.send(wire.EVENT, 0, 0, self._events[0]):
            self._events.pop(0)

    def _send_frame(self):
        self._number += 1
        if not self._link.send(wire.TELEMETRY, 0, 0, self._frame()):
            self.dropped += 1
        self._meter.telemetry.restart()

    def _frame(self):
        meter = self._meter
        window = meter.telemetry
        return struct.pack(
            wire.TELEMETRY_FORMAT,
            self._number & 0xFFFFFFFF,
            self._time.now_us(),
            self._machine.state,
            self._control.mode or wire.MODE_CURRENT,
            self._control.limiting,
            self._guard.fault,
            self._control.setpoint,
            window.voltage_uV(),
            window.voltage_min_uV,
            window.voltage_max_uV,
            window.current_uA(),
            window.current_min_uA,
            window.current_max_uA,
            meter.force_uV,
            meter.heatsink_mC,
            self._control.junction_mC(),
            meter.charge_uC(),
            meter.energy_uJ(),
            window.pairs,
            self._time.overruns,
            self.dropped & 0xFFFFFFFF,
        )
