"""Telemetry frames decoded a second: all of ours (stuffing, check sequence, construct, dataclass) and its parts,
beside plain `struct` on the same bytes."""

from __future__ import annotations

import struct
import time
from collections.abc import Callable

from sinkwright_wire.framing import Deframer, encode_frame
from sinkwright_wire.messages import Telemetry, pack, parse
from sinkwright_wire.vocabulary import Fault, Limiting, Mode, State

ROUNDS = 5
FRAMES = 2000
HEADER = struct.Struct("<BBHHB")
BODY = struct.Struct("<IQBBBBiiiiiiiiiiqqHHI")

TELEMETRY = Telemetry(
    number=123456, time_us=987654321, state=State.SINKING, mode=Mode.CURRENT, limiting=Limiting.NONE,
    fault=Fault.NONE, setpoint=1_500_000, voltage_uV=12_046_959, voltage_min_uV=12_045_000,
    voltage_max_uV=12_047_750, current_uA=1_500_562, current_min_uA=1_500_122, current_max_uA=1_500_922,
    force_uV=12_049_125, heatsink_mC=29_057, junction_mC=47_133, charge_uC=79_966_179, energy_uJ=963_320_949,
    pairs=20, overruns=0, dropped=0,
)  # fmt: skip


def per_second(work: Callable[[], object]) -> float:
    """The best of some rounds: what the machine can do when nothing disturbs it."""
    best = float("inf")
    for _ in range(ROUNDS):
        start = time.perf_counter()
        for _ in range(FRAMES):
            work()
        best = min(best, time.perf_counter() - start)
    return FRAMES / best


def main() -> None:
    content = pack(TELEMETRY)
    frame = encode_frame(content)
    deframer = Deframer()

    def whole() -> None:
        for found in deframer.feed(frame):
            parse(found.content)  # pyright: ignore[reportAttributeAccessIssue]

    def plain() -> tuple[tuple[object, ...], tuple[object, ...]]:
        return HEADER.unpack_from(content), BODY.unpack_from(content, HEADER.size)

    for name, work in (
        ("bytes to message, all of it", whole),
        ("deframing alone", lambda: deframer.feed(frame)),
        ("construct and dataclass", lambda: parse(content)),
        ("plain struct, a tuple", plain),
    ):
        rate = per_second(work)
        print(f"  {name:28s} {rate:9.0f} frames/s, {1e6 / rate:6.1f} us a frame")


if __name__ == "__main__":
    main()
