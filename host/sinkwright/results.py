"""What a run found, as plain values: the quantities, their uncertainty, their verdicts, and the exit code.

Shared by procedures (which make it), records (which keep it), reports and the command line (which show it). It
knows no device, no file and no screen. The JSON forms are the contract that users write scripts against.
"""

from __future__ import annotations

from dataclasses import dataclass, field, replace
from typing import Any, Literal

Verdict = Literal["pass", "fail", "inconclusive", "none"]

#: Ends that a plan asks for; anything else in `stopped_by` is a reason that was not asked for.
END_KEYS = ("end_voltage_V", "end_charge_Ah", "end_energy_Wh", "end_temperature_degC", "duration_s")


@dataclass(frozen=True)
class Contribution:
    """One cause's share of a quantity's uncertainty: its standard uncertainty in the quantity's own unit."""

    cause: str
    standard: float
    remedy: str = ""

    def to_json(self) -> dict[str, Any]:
        return {"cause": self.cause, "standard_uncertainty": self.standard, "remedy": self.remedy}


@dataclass(frozen=True)
class Quantity:
    """One measured quantity with its 95 % interval, and its verdict where the plan gave bounds.

    `value` is None when the quantity could not be found; `reason` then says why.
    """

    name: str
    value: float | None
    unit: str
    expanded_uncertainty: float | None
    coverage_factor: float | None = None
    min: float | None = None
    max: float | None = None
    verdict: Verdict = "none"
    reason: str = ""
    remedy: str = ""
    contributions: tuple[Contribution, ...] = ()

    def to_json(self) -> dict[str, Any]:
        return {
            "value": self.value,
            "unit": self.unit,
            "expanded_uncertainty": self.expanded_uncertainty,
            "coverage_factor": self.coverage_factor,
            "min": self.min,
            "max": self.max,
            "verdict": self.verdict,
            "reason": self.reason,
            "remedy": self.remedy,
            "contributions": [c.to_json() for c in self.contributions],
        }

    @classmethod
    def from_json(cls, name: str, data: dict[str, Any]) -> Quantity:
        shares = tuple(
            Contribution(c["cause"], c["standard_uncertainty"], c.get("remedy", ""))
            for c in data.get("contributions", [])
        )
        known = {key: data[key] for key in _QUANTITY_KEYS if key in data}
        return cls(name=name, contributions=shares, **known)


_QUANTITY_KEYS = (
    "value", "unit", "expanded_uncertainty", "coverage_factor", "min", "max", "verdict", "reason", "remedy",
)  # fmt: skip


@dataclass(frozen=True)
class TestResult:
    """One test of a plan, as carried out."""

    __test__ = False  # pytest would otherwise take the name for a test class

    kind: str
    verdict: Verdict
    quantities: dict[str, Quantity]
    stopped_by: str | None = None
    notes: tuple[str, ...] = ()
    not_tested: tuple[str, ...] = ()
    started_us: int = 0
    ended_us: int = 0
    #: Points for the report's characteristic curves: [{"current_A":, "voltage_V":, ...}]
    points: tuple[dict[str, float], ...] = field(default=())

    def to_json(self) -> dict[str, Any]:
        return {
            "kind": self.kind,
            "verdict": self.verdict,
            "quantities": {name: q.to_json() for name, q in self.quantities.items()},
            "stopped_by": self.stopped_by,
            "notes": list(self.notes),
            "not_tested": list(self.not_tested),
            "started_us": self.started_us,
            "ended_us": self.ended_us,
            "points": [dict(p) for p in self.points],
        }

    @classmethod
    def from_json(cls, data: dict[str, Any]) -> TestResult:
        return cls(
            kind=data["kind"],
            verdict=data["verdict"],
            quantities={n: Quantity.from_json(n, q) for n, q in data["quantities"].items()},
            stopped_by=data["stopped_by"],
            notes=tuple(data.get("notes", ())),
            not_tested=tuple(data.get("not_tested", ())),
            started_us=data.get("started_us", 0),
            ended_us=data.get("ended_us", 0),
            points=tuple(data.get("points", ())),
        )


@dataclass(frozen=True)
class RunResult:
    """A whole plan, as carried out: what `run --json` prints."""

    plan: str
    record: str
    simulated: bool
    tests: tuple[TestResult, ...]

    @property
    def verdict(self) -> Verdict:
        return overall(tuple(test.verdict for test in self.tests))

    def with_record(self, record: str) -> RunResult:
        return replace(self, record=record)

    def to_json(self) -> dict[str, Any]:
        return {
            "plan": self.plan,
            "record": self.record,
            "simulated": self.simulated,
            "verdict": self.verdict,
            "tests": [test.to_json() for test in self.tests],
        }

    @classmethod
    def from_json(cls, data: dict[str, Any]) -> RunResult:
        tests = tuple(TestResult.from_json(t) for t in data["tests"])
        return cls(plan=data["plan"], record=data["record"], simulated=data["simulated"], tests=tests)


def overall(verdicts: tuple[Verdict, ...]) -> Verdict:
    """The verdict over several: one failure fails all, one doubt leaves all in doubt, no bounds give none."""
    for decisive in ("fail", "inconclusive", "pass"):
        if decisive in verdicts:
            return decisive
    return "none"


def exit_code_of(result: RunResult) -> int:
    """130 interrupted, 3 stopped by a protection, 1 fails, 4 inconclusive, 0 else: the first that applies."""
    stops = {test.stopped_by for test in result.tests}
    if "interrupted" in stops:
        return 130
    if stops - {None, "derated", *END_KEYS}:
        return 3
    return {"fail": 1, "inconclusive": 4}.get(result.verdict, 0)
