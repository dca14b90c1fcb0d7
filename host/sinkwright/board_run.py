"""What a board is told about when a run ends, and what it says of the run afterwards, in SI units.

Plain frozen values made into wire messages and from them. It must not send or wait.
"""

from __future__ import annotations

from dataclasses import dataclass, fields, replace
from typing import TYPE_CHECKING, Self

from sinkwright.errors import AskedTooMuch, SinkwrightError
from sinkwright.wire_units import to_integer
from sinkwright_wire.messages import Run, SetEnds
from sinkwright_wire.vocabulary import RunEnd, Silence, State

if TYPE_CHECKING:
    from sinkwright.readings import LoadStatus

_UNSIGNED = 0xFFFF_FFFF


@dataclass(frozen=True)
class BoardEnds:
    """Ends that the board itself keeps to, whichever comes first; None is no such end.

    The voltage is that at the load's sense terminals, the temperature that of the heatsink.
    """

    voltage_V: float | None = None
    charge_Ah: float | None = None
    energy_Wh: float | None = None
    duration_s: float | None = None
    temperature_degC: float | None = None

    def tellable(self) -> Self:
        """The same without ends so far away that the wire has no number for them."""
        return replace(self, **{end.name: None for end in fields(self) if not self._fits(end.name)})

    def _fits(self, name: str) -> bool:
        try:
            type(self)(**{name: getattr(self, name)}).to_wire()
        except AskedTooMuch:
            return False
        return True

    def to_wire(self) -> SetEnds:
        """The message that puts these in force. Raises AskedTooMuch for what is no quantity."""
        return SetEnds(
            _end(self.voltage_V, 1_000_000, "an end voltage", "V"),
            _end(self.charge_Ah, 3_600_000, "an end charge", "Ah", _UNSIGNED),
            _end(self.energy_Wh, 3_600_000, "an end energy", "Wh", _UNSIGNED),
            _end(self.duration_s, 1_000, "a duration", "s", _UNSIGNED),
            _end(self.temperature_degC, 1_000, "an end temperature", "°C"),
        )


def _end(value: float | None, parts: int, what: str, unit: str, largest: int = 0x7FFF_FFFF) -> int:
    # On the wire 0 is no end at all, so the smallest end is one part.
    return 0 if value is None else max(1, to_integer(value, parts, what, unit, largest))


@dataclass(frozen=True)
class BoardRun:
    """A run as its board tells it. `run` is the name that its host gave it, 0 for none.

    Times are on the board's clock in microseconds; `ended_us` is 0 while the run goes on.
    """

    run: int
    state: State
    ended_by: RunEnd
    fetched: bool
    alone: bool
    started_us: int
    ended_us: int
    charge_uC: int
    energy_uJ: int
    log_entries: int

    @classmethod
    def of(cls, run: Run) -> Self:
        return cls(
            run=run.run,
            state=run.state,
            ended_by=run.ended_by,
            fetched=run.fetched,
            alone=run.when_silent == Silence.CONTINUE,
            started_us=run.started_us,
            ended_us=run.ended_us,
            charge_uC=run.charge_uC,
            energy_uJ=run.energy_uJ,
            log_entries=run.log_entries,
        )

    @property
    def going(self) -> bool:
        return self.state == State.SINKING

    @property
    def duration_s(self) -> float:
        """Length of a run that has ended."""
        return (self.ended_us - self.started_us) / 1e6


def goes_on_alone(board: str, status: LoadStatus) -> SinkwrightError:
    """The error for a board that must not be disturbed, because a run goes on by itself on it."""
    return SinkwrightError(
        "a run goes on by itself on this board, without the program that started it",
        where=f"board {board}",
        load=status.in_words,
        remedy="Wait for its end and fetch it with `sinkwright resume`; `sinkwright off` would end it now.",
    )


def not_fetched(board: str, run: BoardRun) -> SinkwrightError:
    """The error for a board that still holds a run which nobody has fetched."""
    return SinkwrightError(
        "the board holds a run that could go on without its program and has not been fetched "
        f"({run.ended_by.sentence.rstrip('.')})",
        where=f"board {board}",
        load="The load is off.",
        remedy="Fetch it with `sinkwright resume`; then run the plan again.",
    )
