"""Sinkwright's firmware: boots safe, then one cooperative loop until power is lost.

Each turn of the loop is one control step at a fixed period, followed by bounded slices of everything that may
wait: the link, the run log, telemetry. Leaving the loop any way at all clamps the gate.
"""

import gc
import sys

from micropython import const

import wire
from chips.adc_ads1115 import ADS1115
from chips.dac_mcp4725 import MCP4725
from control import Control
from dispatch import Dispatch
from guard import Guard
from link import Link
from meter import LARGEST_CURRENT_uA, LARGEST_VOLTAGE_uV, Meter
from runlog import RunLog
from scaling import Demand, Scale, Thermistor
from states import Machine
from telemetry import Telemetry
from thermal import Junction
from timekeeper import Timekeeper

_LOG_ENTRIES = const(4000)
#: The run log is served every so many turns: a second holds 25 of them.
_SLICES = const(16)
_ALLOCATED_BEFORE_COLLECTING = const(16 * 1024)


class Firmware:
    """All parts, joined. `turn` is one turn of the loop."""

    def __init__(self, board):
        image = board.image
        self.machine = Machine(board.gate, board.led)
        self.time = Timekeeper(board.clock, image["period_us"])
        self.meter = Meter(image["period_us"])
        self.guard = Guard(image, self.machine, self.meter, self.time)
        self.control = Control(
            image,
            MCP4725(board.bus, image["dac"]),
            ADS1115(board.bus, image["adc"]),
            _scales(image),
            Thermistor(image["thermistor"]),
            Demand(image["dac"]),
            self.machine,
            self.guard,
            self.meter,
            self.time,
            Junction(image["thermal"]["stages"]),
        )
        self.link = Link(board.stream)
        self.log = RunLog(self.meter, self.time, _LOG_ENTRIES)
        self.telemetry = Telemetry(self.link, self.machine, self.guard, self.control, self.meter, self.time)
        self.dispatch = Dispatch(
            board,
            self.link,
            self.machine,
            self.guard,
            self.control,
            self.meter,
            self.time,
            self.telemetry,
            self.log,
        )
        self._slice = 0
        self.telemetry.tell(wire.EVENT_BOOT, board.reset_cause)

    def turn(self):
        self.time.wait()
        try:
            self.control.step()
        except OSError as error:
            self.guard.on_bus_error(self.control.using, error.errno or 0)
        self.service()

    def service(self):
        """What may wait, in bounded slices."""
        content = self.link.poll()
        if content is not None:
            self.dispatch.take(content)
        self.telemetry.service()
        self._slice = (self._slice + 1) % _SLICES
        if not self._slice:
            self.log.service(self.machine.state == wire.STATE_SINKING)


def _scales(image):
    scales = {name: Scale(image["scales"][name]) for name in ("voltage", "current", "force")}
    for name, largest in (
        ("voltage", LARGEST_VOLTAGE_uV),
        ("force", LARGEST_VOLTAGE_uV),
        ("current", LARGEST_CURRENT_uA),
    ):
        if scales[name].largest() > largest:
            raise ValueError("the " + name + " scale passes what the meter can hold")
    return scales


def run(board):
    """Run for ever. However this is left, the gate is clamped."""
    try:
        firmware = Firmware(board)
        gc.collect()
        gc.threshold(_ALLOCATED_BEFORE_COLLECTING)
        while True:
            firmware.turn()
    finally:
        board.gate.clamp()


def main():
    # Only here: whoever runs the loop on another board must not need the microcontroller's modules.
    from board import open_board

    board = open_board()
    try:
        run(board)
    except KeyboardInterrupt:
        print("stopped by Ctrl-C: the gate is clamped")
    except Exception as error:
        sys.print_exception(error)
        print("the firmware stopped: the gate is clamped")
        raise error


if __name__ == "__main__":
    main()
