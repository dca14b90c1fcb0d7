"""Results as plain values: their JSON form there and back, the verdict over all, the exit code."""

from __future__ import annotations

import json
from itertools import pairwise

import pytest

from sinkwright.results import Contribution, Quantity, RunResult, TestResult, exit_code_of, overall

QUANTITY = Quantity(
    name="no_load_voltage_V",
    value=12.05,
    unit="V",
    expanded_uncertainty=0.08,
    coverage_factor=1.9,
    min=11.5,
    max=12.5,
    verdict="pass",
    reason="It lies within.",
    remedy="",
    contributions=(Contribution("pedestal", 0.03, "Calibrate."),),
)


def a_test(verdict: str = "pass", stopped_by: str | None = None) -> TestResult:
    return TestResult(
        kind="hold",
        verdict=verdict,
        quantities={QUANTITY.name: QUANTITY},
        stopped_by=stopped_by,
        notes=("A note.",),
        not_tested=("Ripple.",),
        started_us=5,
        ended_us=10,
        points=({"current_A": 1.0, "voltage_V": 12.0},),
    )


def run(*tests: TestResult) -> RunResult:
    return RunResult(plan="p", record="", simulated=True, tests=tests)


def test_a_run_comes_back_from_its_json_unchanged() -> None:
    result = run(a_test(), a_test("fail", "duration_s")).with_record("r.sqlite")
    assert RunResult.from_json(json.loads(json.dumps(result.to_json()))) == result


def test_the_json_has_the_keys_that_scripts_rely_on() -> None:
    data = run(a_test()).to_json()
    assert {"plan", "record", "simulated", "verdict", "tests"} <= set(data)
    assert {"kind", "verdict", "quantities", "stopped_by"} <= set(data["tests"][0])
    quantity = data["tests"][0]["quantities"]["no_load_voltage_V"]
    promised = {"value", "unit", "expanded_uncertainty", "coverage_factor", "min", "max", "verdict"}
    assert promised <= set(quantity)


def test_a_quantity_that_was_not_found_comes_back_as_such() -> None:
    missing = Quantity("current_limit_A", None, "A", None, reason="No limit was found.")
    assert Quantity.from_json("current_limit_A", missing.to_json()) == missing


@pytest.mark.parametrize(
    ("verdicts", "over_all"),
    [
        ((), "none"),
        (("none", "none"), "none"),
        (("none", "pass"), "pass"),
        (("pass", "inconclusive"), "inconclusive"),
        (("inconclusive", "fail", "pass"), "fail"),
    ],
)
def test_one_failure_fails_all_and_one_doubt_leaves_all_in_doubt(verdicts: tuple, over_all: str) -> None:
    assert overall(verdicts) == over_all


#: From the first that applies to the last.
EXIT_CODES = (
    (130, a_test("inconclusive", "interrupted")),
    (3, a_test("inconclusive", "over-current")),
    (1, a_test("fail")),
    (4, a_test("inconclusive")),
    (0, a_test("pass", "end_voltage_V")),
    (0, a_test("none")),
)


@pytest.mark.parametrize(("code", "test"), EXIT_CODES)
def test_the_exit_code_of_one_test(code: int, test: TestResult) -> None:
    assert exit_code_of(run(test)) == code


@pytest.mark.parametrize(("first", "second"), list(pairwise(EXIT_CODES)))
def test_the_first_exit_code_that_applies_counts(
    first: tuple[int, TestResult], second: tuple[int, TestResult]
) -> None:
    assert exit_code_of(run(second[1], first[1])) == first[0]


def test_derating_is_no_protection_but_leaves_doubt() -> None:
    assert exit_code_of(run(a_test("inconclusive", "derated"))) == 4
