"""Sinkwright's firmware: boots safe, then one cooperative loop until power is lost.

Each turn of the loop is one control step at a fixed period, followed by bounded slices of everything that may
wait: the link, the run log, telemetry, lamp, fan, watchdog. Leaving the loop any way at all clamps the gate;
startup.py says what comes before the first turn and after the last.
"""

import gc

from micropython import const

import chips
import runlog
import selftest
import startup
import wire
from burst import Burst
from commands import Commands
from control import Control
from dispatch import Dispatch
from ends import Ends
from fan import Fan
from guard import Guard
from lamp import Lamp
from link import Link
from meter import LARGEST_CURRENT_uA, LARGEST_VOLTAGE_uV, Meter
from program import Program
from runs import Runs
from scaling import Demand, Scale, Thermistor
from states import Machine
from store import Store
from telemetry import Telemetry
from thermal import Junction
from timekeeper import Timekeeper

#: The run log is served every so many turns: a second holds 25 of them.
_SLICES = const(16)
_HOUSEKEEPING_SLICE = const(8)
#: Turns for which the OFF button must have been let go before the next press counts: 19 ms.
_BOUNCE_TURNS = const(8)
_ALLOCATED_BEFORE_COLLECTING = const(16 * 1024)


class Firmware:
    """All parts, joined. `turn` is one turn of the loop."""

    def __init__(self, board):
        image = board.image
        self.lamp = Lamp(board.led)
        self.machine = Machine(board.gate, self.lamp)
        self.store = Store(board.store, self.machine)
        self.dac = chips.driver("dac", image["dac"], board)
        self.adc = chips.driver("adc", image["adc"], board)
        self.monitor = chips.driver("monitor", image["monitor"], board) if "monitor" in image else None
        self.time = Timekeeper(board.clock, image["period_us"])
        self.meter = Meter(image["period_us"])
        scales = _scales(image, self.store.get("calibration"))
        self.guard = Guard(image, scales, self.machine, self.meter, self.time)
        self.ends = Ends(self.machine, self.meter, self.time, image["period_us"])
        self.burst = Burst(scales, self.guard, self.machine, self.time)
        self.control = Control(
            image,
            self.dac,
            self.adc,
            scales,
            Demand(image["dac"]),
            self.machine,
            self.guard,
            self.meter,
            self.time,
            Junction(image["thermal"]["stages"]),
            self.burst,
            self.ends,
        )
        self.program = Program(image["period_us"], self.control, self.machine, self.ends, board.trigger)
        self.link = Link(board.stream)
        self.log = runlog.RunLog(self.meter, self.time, runlog.LARGEST)
        self.telemetry = Telemetry(self.link, self.machine, self.guard, self.control, self.meter, self.time)
        self.runs = Runs(self.machine, self.guard, self.ends, self.time, self.telemetry)
        self.fan = Fan(board.fan)
        self.commands = Commands(board, self)
        self.dispatch = Dispatch(board, self.link, self.guard, self.commands)
        #: What the self-test found (wire.SELF_TEST_...); startup.py says it.
        self.self_test = wire.SELF_TEST_PASSED
        #: Why the load stays off since this start, in words; "" where it does not.
        self.why_off = ""
        #: Whether a host has asked for a restart, and for which: None, 0 or 1 (for maintenance).
        self.restart_to = None
        self._button = board.button
        self._button_turns = 0
        self._feed_watchdog = board.watchdog.feed
        self._overruns_fed = 0
        self._slice = 0
        self.telemetry.tell(wire.EVENT_BOOT, board.reset_cause)

    def turn(self):
        self.time.wait()
        if self.program.running:
            self.program.step()
        try:
            self.control.step()
        except OSError as error:
            self.guard.on_bus_error(self.control.using, error.errno or 0)
        self.service()

    def service(self):
        """What may wait, in bounded slices."""
        if self._button():
            self._hold_off()
        elif self._button_turns:
            self._button_turns -= 1
        if self.monitor is not None and self.monitor.tripped():
            self.guard.latch(wire.FAULT_OVER_CURRENT, self.meter.current_uA, self.monitor.limit_uA)
        if self.runs.going and self.machine.state != wire.STATE_SINKING:
            self.runs.note_end()
        content = self.link.poll()
        if content is not None:
            self.dispatch.take(content)
        self.telemetry.service()
        self._slice = (self._slice + 1) % _SLICES
        if not self._slice:
            self.log.service(self.machine.state == wire.STATE_SINKING)
        elif self._slice == _HOUSEKEEPING_SLICE:
            self._keep_house()

    def _hold_off(self):
        """The OFF button is pressed: off, and told once, although its contacts bounce."""
        if not self._button_turns or self.machine.state == wire.STATE_SINKING:
            self.commands.disable()
            self.telemetry.tell(wire.EVENT_BUTTON)
        self._button_turns = _BOUNCE_TURNS

    def _keep_house(self):
        """Lamp and fan; the watchdog is fed only if no deadline was missed since the last time."""
        self.lamp.turn()
        self.fan.service(self.meter.heatsink_mC, self.guard.fault)
        overruns = self.time.overruns
        if overruns == self._overruns_fed:
            self._feed_watchdog()
        self._overruns_fed = overruns
        if self.restart_to is not None:
            raise startup.Restart(self.restart_to)


def _scales(image, calibration):
    scales = {}
    for name in ("voltage", "current", "force"):
        scales[name] = Scale(image["scales"][name])
    if calibration and not selftest.check_calibration(calibration, image):
        for name in scales:
            scales[name].calibrate(calibration[name])
    for name, largest in (
        ("voltage", LARGEST_VOLTAGE_uV),
        ("force", LARGEST_VOLTAGE_uV),
        ("current", LARGEST_CURRENT_uA),
    ):
        if scales[name].largest() > largest:
            raise ValueError("the " + name + " scale passes what the meter can hold")
    scales["thermistor"] = Thermistor(image["thermistor"])
    return scales


def run(board):
    """Run until the loop is left, clamp, and restart: see startup.py. In a maintenance boot no watchdog runs."""
    try:
        firmware = startup.start(board, Firmware)
        gc.collect()
        gc.threshold(_ALLOCATED_BEFORE_COLLECTING)
        if not board.maintenance:
            board.watchdog.start()
        while True:
            firmware.turn()
    except (Exception, KeyboardInterrupt) as error:
        board.gate.clamp()
        startup.leave(board, error)
    finally:
        board.gate.clamp()


def main():
    # Only here: whoever runs the loop on another board must not need the microcontroller's modules.
    from board import open_board

    run(open_board())


if __name__ == "__main__":
    main()
