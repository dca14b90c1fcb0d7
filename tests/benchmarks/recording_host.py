"""Processor share of a host that records about 100 telemetry frames a second from a pseudo-terminal, beside a bare
pyserial reader of the same port that throws everything away. The simulated board is another process at real time.
"""

from __future__ import annotations

import json
import subprocess
import sys
import tempfile
import time
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

SECONDS = 20.0
SOURCE = 'kind = "supply"\nvoltage_V = 12.1\nresistance_ohm = 0.045\n'

RECORDING = """
import asyncio, resource, sys, time
from pathlib import Path
from sinkwright.instrument import Instrument
from tests.benchmarks.support import record_writer
async def main():
    load = await Instrument.open(sys.argv[1])
    await load.stream(0.0094)
    await load.set_current(1.0)
    await load.on()
    writer = record_writer(Path(sys.argv[2]))
    frames, start, before = 0, time.monotonic(), usage()
    while time.monotonic() - start < float(sys.argv[3]):
        sample = await load.next_sample(1.0)
        if sample is not None:
            writer.add_samples([sample])
            frames += 1
    share = (usage() - before) / (time.monotonic() - start)
    await load.close()
    print(frames / (time.monotonic() - start), share)
def usage():
    used = resource.getrusage(resource.RUSAGE_SELF)
    return used.ru_utime + used.ru_stime
asyncio.run(main())
"""

BARE = """
import resource, serial, sys, time
sys.path[:0] = []
from sinkwright_wire.conversation import Conversation
from sinkwright_wire.messages import SetTelemetry
def usage():
    used = resource.getrusage(resource.RUSAGE_SELF)
    return used.ru_utime + used.ru_stime
port = serial.Serial(sys.argv[1], timeout=0.1)
talk = Conversation(7)
def ask(data):
    port.write(data)
    while talk.outstanding:
        talk.receive(port.read(max(1, port.in_waiting)))
ask(talk.hello(False))
ask(talk.request(SetTelemetry(4)))
octets, start, before = 0, time.monotonic(), usage()
while time.monotonic() - start < float(sys.argv[3]):
    octets += len(port.read(max(1, port.in_waiting)))
print(octets / (time.monotonic() - start), (usage() - before) / (time.monotonic() - start))
"""


@contextmanager
def simulated_board(folder: Path) -> Iterator[str]:
    source = folder / "source.toml"
    source.write_text(SOURCE, encoding="utf-8")
    command = [
        sys.executable,
        "-m",
        "sinkwright",
        "simulate",
        "--source",
        str(source),
        "--listen",
        "pty",
        "--json",
    ]
    process = subprocess.Popen(command, stdout=subprocess.PIPE, text=True)
    try:
        assert process.stdout is not None  # it is a pipe
        yield json.loads(process.stdout.readline())["url"]
    finally:
        process.terminate()
        process.wait()


def share_of(script: str, folder: Path) -> tuple[float, float]:
    """(what came a second, processor share) of `script` beside a fresh simulated board."""
    with simulated_board(folder) as url:
        time.sleep(1.0)
        command = [sys.executable, "-c", script, url, str(folder), str(SECONDS)]
        printed = subprocess.run(command, capture_output=True, text=True, check=True).stdout
    rate, share = printed.split()
    return float(rate), float(share)


def main() -> None:
    with tempfile.TemporaryDirectory() as name:
        frames, recording = share_of(RECORDING, Path(name))
        octets, bare = share_of(BARE, Path(name))
    print(f"  recording {frames:.0f} frames/s: {100 * recording:.1f} % of a core")
    print(f"  bare pyserial reader of {octets:.0f} octets/s: {100 * bare:.1f} % of a core")


if __name__ == "__main__":
    main()
