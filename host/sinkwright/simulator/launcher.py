"""Starts one simulated board: the shipped firmware in an interpreter, with drawn parts, a source and a
memory.

Puts together what others decide: the parts (`draws`), the integers of the board file (`board_image`), the
interpreter and the process. Time passes only inside `exchange`. It must not know frames or messages.
"""

from __future__ import annotations

import json
from collections.abc import Sequence
from pathlib import Path
from typing import Any

import msgspec

from sinkwright.board_image import compile_board
from sinkwright.definitions.board import BoardFile
from sinkwright.definitions.source import SourceFile
from sinkwright.firmware_files import find_firmware
from sinkwright.simulator.child import MAX_BYTES, Child
from sinkwright.simulator.draws import draw_board_id, draw_plant, source_keys
from sinkwright.simulator.interpreter import Interpreter, find_interpreter
from sinkwright.simulator.memory import take_out

_START = Path(__file__).resolve().parent / "board_side" / "start.py"
_POWER_ON = 1


class SimulatedBoard:
    """A running simulated board.

    `exchange` is the way in and out. Use it from one thread at a time.
    """

    def __init__(self, child: Child, interpreter: Interpreter) -> None:
        self.interpreter = interpreter.name
        self.board_time_us = 0
        self._child = child

    @classmethod
    def start(
        cls,
        source: SourceFile,
        board: BoardFile,
        seed: int,
        store: Path | None = None,
        *,
        firmware: Path | None = None,
        interpreter: Interpreter | None = None,
        defects: Sequence[dict[str, Any]] = (),
    ) -> SimulatedBoard:
        """Power up the board number `seed` of this kind, with `source` connected.

        `store` keeps what the board remembers; without it every start is the first. `firmware` and
        `interpreter` default to the shipped ones; `defects` are faults of the circuit at given times, as
        `board_side` has them. Raises FileError for a bad store. A board that cannot start is told by the
        first exchange (LinkLost).
        """
        interpreter = interpreter or find_interpreter()
        set_up = {
            "firmware": str(firmware or find_firmware()),
            "image": compile_board(board),
            "seed": seed,
            "memory": None if store is None else _memory(store, seed),
            "board_id": draw_board_id(seed).hex(),
            "reset_cause": _POWER_ON,
            "source": source_keys(source),
            "plant": draw_plant(board, seed) | {"defects": list(defects)},
        }
        first_line = json.dumps(set_up, ensure_ascii=False).encode() + b"\n"
        return cls(Child(interpreter.run(_START), first_line, "simulated board"), interpreter)

    def exchange(self, data: bytes, grant_us: int) -> tuple[bytes, int]:
        """Send `data`, let the board run until it says something or `grant_us` of its time is used up.

        Returns its bytes, and its clock in microseconds since power-up. A grant may be passed by less than a
        control step. Raises LinkLost when the board has ended.
        """
        early = b""
        while len(data) > MAX_BYTES:
            early += self._child.exchange(data[:MAX_BYTES], 0)[0]
            data = data[MAX_BYTES:]
        answer, self.board_time_us = self._child.exchange(data, grant_us)
        return early + answer, self.board_time_us

    def run_ahead(self, grant_us: int) -> None:
        """Begin an exchange without bytes, and do not wait for it; `catch_up` must come next."""
        self._child.begin(b"", grant_us)

    def catch_up(self) -> tuple[bytes, int]:
        """What `run_ahead` led to, as from `exchange`."""
        answer, self.board_time_us = self._child.finish()
        return answer, self.board_time_us

    def close(self) -> None:
        """Power down. May be called twice; never raises."""
        self._child.close()


def _memory(store: Path, seed: int) -> dict[str, Any]:
    """What the board remembers, and the file where it keeps it from now on."""
    return {"path": str(store.absolute()), **msgspec.to_builtins(take_out(store, seed))}
