"""How many times real time the simulated board runs, with the shipped control period and the true firmware,
recording at 10 frames a second: beside the same board unrecorded, and beside a child that only answers (the floor
that the pipe and the host set). Then the budget: where a control step's time goes, measured inside the interpreter.
"""

from __future__ import annotations

import asyncio
import json
import subprocess
import tempfile
import time
from pathlib import Path

from sinkwright.board_image import compile_board
from sinkwright.definitions.loading import load_board, parse_source
from sinkwright.firmware_files import find_firmware
from sinkwright.instrument import Instrument
from sinkwright.simulator import launcher
from sinkwright.simulator.draws import draw_board_id, draw_plant, source_keys
from sinkwright.simulator.interpreter import find_interpreter
from tests.benchmarks.support import record_writer

SOURCE = 'kind = "supply"\nvoltage_V = 12.1\nresistance_ohm = 0.045\nlimit_A = 2.5\n'
ROUNDS = 8
SECONDS_A_ROUND = 20.0
BOARD_SIDE = Path(launcher.__file__).parent / "board_side"

BUDGET = """
import sys, json, time, gc
sys.path[:0] = [{board_side!r}, {firmware!r}]
import board
class Pipe:
    out_count = 0
    def put(self, data): self.out_count += len(data)
    def answer(self, now): self.out_count = 0
    def grant(self): return 100000, b""
b = board.install(json.loads({setup!r}), Pipe())
b = board.open_board()
import main, states, wire
f = main.Firmware(b)
for _ in range(300): f.turn()
f.control.obey(wire.MODE_CURRENT, 1500000); f.control.start(); f.meter.restart(); f.log.begin()
f.machine.fire(states.ENABLE)
f.guard.quiet_steps = -1 << 28
for _ in range(2000): f.turn()
word = bytearray(2); order = bytearray([0xC3, 0xE3])
def best(work, n=420, rounds=60):
    least = 1 << 40
    for _ in range(rounds):
        start = time.ticks_us()
        for _ in range(n): work()
        least = min(least, time.ticks_diff(time.ticks_us(), start))
    return least / n
def transactions():
    b.bus.readfrom_mem_into(72, 1, word); b.bus.readfrom_mem_into(72, 0, word); b.adc.busy_until = -1
    b.bus.writeto_mem(72, 1, order)
def spin():
    a = 0
    for i in range(100): a = (a * 3 + i) & 0xFFFF
def mean(work, n=42000):
    start = time.ticks_us()
    for _ in range(n): work()
    return time.ticks_diff(time.ticks_us(), start) / n
print("the machine's noise: mean over best of a fixed loop, x", mean(spin) / best(spin))
print("whole turn of the loop, mean", mean(f.turn))
print("whole turn of the loop, best", best(f.turn))
print("  of it: chips and circuit, three bus transactions", best(transactions))
print("  of it: the simulated world moving on (wait)", best(f.time.wait))
print("  of it: link, telemetry, run log (service)", best(f.service))
print("  of it: junction estimate, every second step", best(f.control._estimate_junction) / 2)
print("an empty call, for scale", best(lambda: None))
"""


async def times_real_time(writer) -> tuple[float, float]:
    """(best round, all rounds) of a sinking board at 10 frames a second."""
    with tempfile.TemporaryDirectory() as folder:
        source = Path(folder, "source.toml")
        source.write_text(SOURCE, encoding="utf-8")
        load = await Instrument.open(f"sim:{source},speed=max,seed=1")
        await load.stream(0.1)
        await load.set_current(1.5)
        await load.on()
        best = total_board_s = total_wall_s = 0.0
        for _ in range(ROUNDS):
            wall = time.perf_counter()
            sample = await load.next_sample(1.0)
            first = last = sample
            while last.time_us - first.time_us < SECONDS_A_ROUND * 1e6:
                last = await load.next_sample(1.0)
                if writer is not None:
                    writer.add_samples([last])
            wall = time.perf_counter() - wall
            board_s = (last.time_us - first.time_us) / 1e6
            best = max(best, board_s / wall)
            total_board_s += board_s
            total_wall_s += wall
        await load.close()
    return best, total_board_s / total_wall_s


def budget() -> str:
    board = load_board(None)
    setup = {
        "image": compile_board(board),
        "seed": 1,
        "boot_number": 1,
        "board_id": draw_board_id(1).hex(),
        "source": source_keys(parse_source(SOURCE)),
        "plant": draw_plant(board, 1),
    }
    script = BUDGET.format(board_side=str(BOARD_SIDE), firmware=str(find_firmware()), setup=json.dumps(setup))
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder, "budget.py")
        path.write_text(script, encoding="utf-8")
        done = subprocess.run(find_interpreter().run(path), capture_output=True, text=True, check=True)
    return done.stdout


def main() -> None:
    with tempfile.TemporaryDirectory() as folder:
        recorded = asyncio.run(times_real_time(record_writer(Path(folder))))
    unrecorded = asyncio.run(times_real_time(None))
    print(
        f"  recorded at 10 frames/s:   best round {recorded[0]:.0f}, mean {recorded[1]:.0f} times real time"
    )
    print(
        f"  the same, not recorded:    best round {unrecorded[0]:.0f}, mean {unrecorded[1]:.0f} times real time"
    )
    for line in budget().splitlines():
        what, _, us = line.rpartition(" ")
        unit = "times" if what.endswith(" x") else "us"
        print(f"  {what.removesuffix(' x'):58s} {float(us):6.2f} {unit}")


if __name__ == "__main__":
    main()
