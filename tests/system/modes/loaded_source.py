"""The true firmware on a simulated board without tolerances, moved by a test in the same interpreter, with no host.

`Loaded(source)` boots it before that source and gathers its zero; then `sink` and `run_s`. What truly flows is
told by the simulated source itself, at every step of its integration: `peak_A` catches what no converter sees.
"""

import nominal_board

import board
import main
import states
import wire

MODES = {
    "current": wire.MODE_CURRENT,
    "power": wire.MODE_POWER,
    "resistance": wire.MODE_RESISTANCE,
    "voltage": wire.MODE_VOLTAGE,
}
PARTS = {"current": 1e6, "power": 1e6, "resistance": 1e3, "voltage": 1e6}
LIMITING = (
    "none",
    "source",
    "ramping",
    "derated",
    "no source",
    "saturated",
    "unreachable",
    "unresolved",
    "unsettled",
)


class NoHost:
    """Grants all the time there is, and takes what the board says."""

    out_count = 0

    def put(self, data):
        pass

    def answer(self, now_us):
        pass

    def grant(self):
        return 1 << 50, b""


class Loaded:
    def __init__(self, image, source, noise_counts=1.0, defects=(), **limits):
        image = dict(image)
        image["limits"] = dict(image["limits"])
        image["limits"].update(limits)
        plant = nominal_board.plant(defects=list(defects))
        plant["adc"]["noise_counts"] = noise_counts
        setup = {
            "image": image,
            "plant": plant,
            "source": source,
            "seed": 1,
            "boot_number": 1,
            "board_id": "0011223344556677",
        }
        board.install(setup, NoHost())
        self.board = board.open_board()
        self.plant = self.board.plant
        self.firmware = main.Firmware(self.board)
        self.control = self.firmware.control
        self.peak_A = 0.0
        self._watch(self.plant.source)
        self.run_s(0.4)

    def _watch(self, source):
        step = source.step

        def watched(*arguments):
            step(*arguments)
            if source.current_A > self.peak_A:
                self.peak_A = source.current_A

        source.step = watched

    def run_s(self, seconds):
        firmware = self.firmware
        until = self.board.clock.ticks_us() + int(seconds * 1e6)
        while self.board.clock.ticks_us() < until:
            firmware.guard.quiet_steps = 0
            firmware.turn()

    def ask(self, mode, value):
        self.control.obey(MODES[mode], int(value * PARTS[mode] + 0.5))

    def sink(self, mode, value):
        self.ask(mode, value)
        self.firmware.meter.restart()
        self.control.start()
        self.firmware.machine.fire(states.ENABLE)

    def limiting(self):
        return LIMITING[self.control.limiting]

    def fault(self):
        return self.firmware.guard.fault

    def mean(self, seconds):
        """(V, A) as the board reads them, over a while."""
        window = self.firmware.meter.telemetry
        window.restart()
        self.run_s(seconds)
        return window.voltage_uV() * 1e-6, window.current_uA() * 1e-6

    def true(self):
        """(V, A) as they are."""
        self.plant.disturb(1)
        return self.plant.source_V, self.plant.current_A
