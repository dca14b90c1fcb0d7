"""The rows whose fault lies in the firmware itself: an exception in any module, Ctrl-C anywhere, a cut-off write.

Which functions there are is read from the firmware's sources, so that a new module is covered without being listed.
"""

from __future__ import annotations

import ast
from collections.abc import Sequence
from dataclasses import replace
from pathlib import Path
from typing import Any

from sinkwright.firmware_files import find_firmware

from .children import Case, setup
from .rows import SUPPLY, Row, restarted

_EXCEPTION, _SOFT = 4, 3
#: One whole round of the schedule's 66 steps with four transactions at most in each.
_BUS_CALLS = 66 * 4
#: What a host may do in a run, so that as many functions as possible are called.
_BUSY = [
    [5_000, "SET_POINT", 1, 900_000],
    [10_000, "GET_STATUS"],
    [15_000, "IDENTIFY"],
    [20_000, "GET_LIMITS", 0],
    [25_000, "GET_LOG", 0],
    [30_000, "GET_FAULT"],
    [35_000, "GET_RUN"],
    [40_000, "SET_POINT", 9, 0],
    [170_000, "DISABLE"],
]
#: They hold constants only, or are the file that the simulated board replaces.
_NOT_RUN = frozenset({"wire", "safe_image", "board"})
#: What is called by nothing of the firmware's own, so that nothing of it could catch the exception.
_OUTERMOST = frozenset({("main", "run"), ("main", "main")})
#: Earlier than the other rows' onset: nothing must have settled.
_EARLY_us = 650_000
_AT_BOOT_us = 100_000
#: Longer than a round of the schedule, or what is asked below.
_RUN_us = 250_000


def functions() -> list[tuple[str, str | None, str]]:
    """(module, class or None, function) of everything that the firmware defines at the top of a file."""
    firmware = find_firmware()
    found: list[tuple[str, str | None, str]] = []
    for path in sorted(firmware.rglob("*.py")):
        module = ".".join(path.relative_to(firmware).with_suffix("").parts).removesuffix(".__init__")
        if module not in _NOT_RUN and _fitted(module):
            found += [(module, owner, name) for owner, name in _defined(path)]
    return [entry for entry in found if (entry[0], entry[2]) not in _OUTERMOST]


def _fitted(module: str) -> bool:
    """Whether the shipped board has the part of a driver; other modules are on every board."""
    folder, _, driver = module.partition(".")
    if folder != "chips" or not driver:
        return True
    kind, _, part = driver.partition("_")
    image = setup(SUPPLY, [])["image"]
    return kind in image and image[kind]["part"].lower() == part


def _defined(path: Path) -> list[tuple[str | None, str]]:
    names: list[tuple[str | None, str]] = []
    for node in ast.parse(path.read_text(encoding="utf-8")).body:
        if isinstance(node, ast.FunctionDef):
            names.append((None, node.name))
        elif isinstance(node, ast.ClassDef):
            names += [
                (node.name, inner.name)
                for inner in node.body
                if isinstance(inner, ast.FunctionDef) and not inner.decorator_list
            ]
    return names


class EveryFunction(Row):
    """One run for each function, which raises at its first call after the onset, and one where it does so at boot."""

    def cases(self) -> list[Case]:
        return [self._raising(entry, at_boot) for entry in functions() for at_boot in (False, True)]

    def _raising(self, entry: tuple[str, str | None, str], at_boot: bool) -> Case:
        module, owner, function = entry
        trouble = {"kind": "raising", "module": module, "owner": owner, "function": function}
        case = replace(self, trouble=trouble)._case(0 if at_boot else _EARLY_us)
        return replace(case, end_us=_AT_BOOT_us if at_boot else _EARLY_us + _RUN_us)


class EveryBusCall(Row):
    """One run for each bus transaction of a round of the schedule."""

    def cases(self) -> list[Case]:
        return [
            replace(
                replace(self, trouble={"kind": "bus_interrupted", "call": call})._case(_EARLY_us),
                end_us=_EARLY_us + _RUN_us,
            )
            for call in range(1, _BUS_CALLS + 1)
        ]


def check_reached(cases: Sequence[Case], findings: Sequence[dict[str, Any]]) -> None:
    """Raise when the functions of a module were none of them called: its exceptions were then not tried."""
    reached = {
        case.trouble["module"]
        for case, finding in zip(cases, findings, strict=True)
        if finding["struck_us"] is not None
    }
    missed = {module for module, _, _ in functions()} - reached
    if missed:
        raise AssertionError(f"no function of {', '.join(sorted(missed))} was called in these runs")


EVERY_FUNCTION = "exception in every module"
ROWS = (
    EveryFunction(
        EVERY_FUNCTION,
        "Exception raised in every function of every module in turn",
        (restarted(_EXCEPTION),),
        1,
        commands=_BUSY,
        strikes_by_chance=True,
    ),
    EveryBusCall(
        "ctrl-c at each bus call",
        "Ctrl-C at each bus call of the loop",
        (restarted(_SOFT),),
        1,
        strikes_by_chance=True,
    ),
)

CHECK_SUM = "check sum of the slot, at the next start"
POWER_CUT = Row("power cut at every octet", "Power cut at every octet of a store's write", (CHECK_SUM,), 0)
