"""How the control step is watched for allocations, and in which situations: for both interpreters.

An allocation under heap_lock raises MemoryError, which fails the test. The figure tells what heap_lock does not:
`micropython.mem_total` also counts a frame that was too large for the stack and came from the heap. The 32-bit
interpreter has no mem_total; there it is `gc.mem_alloc`, and what is looked for is an integer beyond 31 bits.
"""

from __future__ import annotations

MEM_TOTAL = "micropython.mem_total()"
MEM_ALLOC = "gc.mem_alloc()"

_CHECK = """
    session = Session()
    session.sink(1_000_000)
    {arrange}
    firmware = session.firmware
    wait = firmware.time.wait
    step = firmware.control.step
    wait(); step()
    gc.collect()
    total = {figure}
    total = {figure}
    micropython.heap_lock()
    try:
        for _ in range({steps}):
            wait()
            step()
    finally:
        micropython.heap_unlock()
    found = [{figure} - total, firmware.guard.fault, firmware.meter.telemetry.pairs]
"""

ARRANGEMENTS = {
    "sinking": "session.firmware.guard.quiet_steps = -10000",
    "off": "session.ask(wire.DISABLE); session.board.show(0, 12_000_000)",
    "source limits": "session.firmware.guard.quiet_steps = -10000; session.board.show(100_000, 50_000)",
    "set-point changes": "session.firmware.guard.quiet_steps = -10000; session.firmware.control.ask(0)",
    "over-current": "session.board.show(5_900_000, 12_000_000)",
    "hot": "session.board.show(None, 12_000_000, 90_000)",
    "host silent": "session.firmware.guard.quiet_steps = 1270",
    "late": "session.board.clock.stall_us = 60_000",
    "not ready": "session.board.bus.ready = False",
    "other channel": "session.board.bus.converting = False",
    "reversed": "session.board.show(0, -1_000_000)",
    "extremes": "session.board.bus.counts[:] = [32767, -32768, 32767, -32768]",
}


def heap_check(arrange: str, *, figure: str, steps: int = 400) -> str:
    """The lines for the board; they find [octets allocated, fault, pairs measured]."""
    return _CHECK.format(arrange=arrange, figure=figure, steps=steps)
