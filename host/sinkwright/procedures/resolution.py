"""Whether a plan's bounds can be met at all: the uncertainty to be expected, before the first reading.

Takes the middle of each pair of bounds as if it had been read, without scatter, and asks what the board's
parts make of it. A tolerance narrower than 2U can give no pass (JCGM 106): better said before an hour of
measuring.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

from sinkwright.definitions.plan import AnyTest, Hold, LoadRegulation
from sinkwright.procedures.load_regulation import full_load_A, regulation_of
from sinkwright.uncertainty.causes import Uncertain, expand
from sinkwright.uncertainty.parts import Averaged, PartsModel
from sinkwright.uncertainty.verdict import could_pass

if TYPE_CHECKING:
    from sinkwright.definitions.board import BoardFile
    from sinkwright.definitions.plan import Bounds, Plan


def hopeless_bounds(plan: Plan, board: BoardFile) -> list[str]:
    """A sentence for each pair of bounds that no reading of this board could pass."""
    model = PartsModel(board)
    sentences = []
    for number, test in enumerate(plan.tests, start=1):
        for name, bounds in test.accept.items():
            expected = _expected(name, bounds, test, plan, model)
            if expected is None:
                continue
            sentence = could_pass(expand(expected).half_width, bounds.min, bounds.max)
            if sentence:
                sentences.append(f"Test {number} ({test.kind}), {name}: {sentence}")
    return sentences


def _expected(name: str, bounds: Bounds, test: AnyTest, plan: Plan, model: PartsModel) -> Uncertain | None:
    """The quantity as if its middle had been read; None where there is no middle, or no rating to go by."""
    if bounds.min is None or bounds.max is None:
        return None
    middle = (bounds.min + bounds.max) / 2
    if name in ("no_load_voltage_V", "full_load_voltage_V", "open_circuit_voltage_V", "voltage_V"):
        return _voltage(model, middle)
    if name in ("current_limit_A", "short_circuit_current_A", "current_A"):
        return _current(model, middle)
    rated_V = plan.source.rated_voltage_V
    if isinstance(test, LoadRegulation) and rated_V is not None:
        return _regulation(name, middle, rated_V, full_load_A(test, plan.source), model)
    if name == "power_W" and rated_V is not None and isinstance(test, Hold):
        current_A = test.current_A or middle / rated_V
        return _voltage(model, middle / current_A) * _current(model, current_A) if current_A else None
    return None


def _regulation(name: str, middle: float, full_V: float, full_A: float, model: PartsModel) -> Uncertain:
    percent = middle if name == "load_regulation_percent" else middle * full_A / full_V * 100
    first = _voltage(model, full_V * (1 + percent / 100))
    last = _voltage(model, full_V)
    if name == "load_regulation_percent":
        return regulation_of(first, last)
    return (first - last) / _current(model, full_A)


def _voltage(model: PartsModel, value: float) -> Uncertain:
    return model.voltage(Averaged(value, 0.0, 1000, "expected voltage"))


def _current(model: PartsModel, value: float) -> Uncertain:
    return model.current(Averaged(value, 0.0, 1000, "expected current"))
