"""`rest`: the gate clamped for a while, so that source and heatsink come to rest; the open voltage."""

from __future__ import annotations

from collections import deque
from dataclasses import dataclass, field
from typing import TYPE_CHECKING

from sinkwright.definitions.plan import Rest
from sinkwright.procedures.gathering import point_of
from sinkwright.procedures.leads import Terminals
from sinkwright.procedures.procedure import NOT_REACHED, Found, Procedure, Step, board_clock

if TYPE_CHECKING:
    from sinkwright.sample import Sample

#: The open voltage is the mean of this much of the end of the rest.
TAIL_s = 1.0


def steps(test: Rest) -> list[Step]:
    """Nothing is drawn."""
    return [Step(0.0, test.duration_s)]


@dataclass
class RestRun(Procedure[Rest]):
    """One rest under way."""

    kind = "rest"

    began_us: int | None = None
    elapsed_s: float = 0.0
    tail: deque[Sample] = field(default_factory=deque)

    async def carry_out(self) -> None:
        await self.bench.off()
        self.bench.say(f"The load is off and rests for {self.test.duration_s:g} s.")
        while self.elapsed_s < self.test.duration_s or len(self.tail) < 2:
            frame = await self.bench.next_frame()
            if self.began_us is None:
                self.began_us = frame.time_us
            self.elapsed_s = (frame.time_us - self.began_us) / 1e6
            if frame.pairs:
                self.tail.append(frame)
            while len(self.tail) > 2 and frame.time_us - self.tail[0].time_us > TAIL_s * 1e6:
                self.tail.popleft()
        self.stopped_by = "duration_s"

    def found(self) -> dict[str, Found]:
        if len(self.tail) < 2:
            missing = Found(None, NOT_REACHED)
            return {"open_circuit_voltage_V": missing, "duration_s": missing}
        point = point_of(list(self.tail), None, "at the end of the rest")
        cut_short = "" if self.stopped_by else "The rest was stopped before its end."
        return {
            "open_circuit_voltage_V": Found(
                Terminals(self.bench.board, self.source).voltage(point), "", cut_short
            ),
            "duration_s": Found(board_clock() * self.elapsed_s, "", cut_short),
        }
