"""From the board's readings to the source's own terminals: what two wires drop is added back.

With two wires the leads' drop is part of every voltage reading. A resistance stated in the plan is added
back, with its uncertainty as one cause that all points share; without both numbers a verdict that depends
on the leads is not given at all.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

from sinkwright.uncertainty.causes import Cause, Uncertain
from sinkwright.uncertainty.parts import PartsModel

if TYPE_CHECKING:
    from sinkwright.definitions.board import BoardFile
    from sinkwright.definitions.plan import SourceUnderTest
    from sinkwright.procedures.gathering import Point

UNKNOWN_LEADS = (
    "The voltage was read at the load's end of two leads whose resistance is not known, so their drop "
    "cannot be told "
    "from the source's own. Use the sense pair, or state lead_resistance_ohm and "
    "lead_resistance_uncertainty_ohm."
)
_REMEDY = "Use the sense pair, or measure the leads more exactly."


class Terminals:
    """Readings at the source's terminals, in V and A, with their causes."""

    def __init__(self, board: BoardFile, source: SourceUnderTest) -> None:
        self._board = board
        self._two_wire = source.sense == "two-wire"
        self._leads: Uncertain | None = None
        if self._two_wire and source.lead_resistance_ohm is not None:
            # Stated as "plus or minus": a half-width with nothing known inside it (JCGM 100, 4.3.7).
            cause = Cause(
                "lead resistance",
                "rectangular",
                source.lead_resistance_uncertainty_ohm or 0.0,
                remedy=_REMEDY,
            )
            self._leads = Uncertain(source.lead_resistance_ohm, {cause: 1.0})

    def current(self, point: Point) -> Uncertain:
        """The current in A; exactly zero with the gate clamped, since the board faults if any flows."""
        if point.demand_A is None:
            return Uncertain.exact(0.0)
        return self._model(point).current(point.current)

    def voltage(self, point: Point) -> Uncertain:
        """The voltage in V at the source's terminals."""
        reading = self._model(point).voltage(point.voltage)
        if self._leads is None or point.demand_A is None:
            return reading
        return reading + self.current(point) * self._leads

    def _model(self, point: Point) -> PartsModel:
        """What the parts make of readings with this point's ripple; causes are the same for all points."""
        return PartsModel(self._board, ripple_V_pp=point.ripple_V)

    def unresolved(self, *points: Point | None) -> str:
        """Why a verdict over these points cannot be given, or nothing: only current makes the leads drop."""
        drawn = any(point is not None and point.demand_A is not None for point in points)
        return UNKNOWN_LEADS if self._two_wire and self._leads is None and drawn else ""
