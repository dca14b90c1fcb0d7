from __future__ import annotations

import copy
from typing import Any

import pytest

from sinkwright.records.checks import checked
from sinkwright.results import TestResult
from tests.host.records.made_up import hold, regulation


@pytest.mark.parametrize("result", [regulation(), hold()])
def test_a_result_of_a_run_passes_as_it_is(result: TestResult) -> None:
    assert checked(TestResult.from_json(result.to_json())) == result


@pytest.mark.parametrize(
    ("place", "value"),
    [
        (("kind",), 7),
        (("verdict",), "splendid"),
        (("started_us",), "soon"),
        (("stopped_by",), 7),
        (("notes",), [None]),
        (("points",), [{"current_A": "much"}]),
        (("quantities", "load_regulation_percent", "value"), "12"),
        (("quantities", "load_regulation_percent", "max"), True),
        (("quantities", "load_regulation_percent", "verdict"), 1),
        (("quantities", "load_regulation_percent", "reason"), ["a"]),
        (("quantities", "load_regulation_percent", "contributions"),
         [{"cause": "a", "standard_uncertainty": None}]),
    ],
)  # fmt: skip
def test_a_result_with_something_else_in_place_is_refused(place: tuple[str, ...], value: Any) -> None:
    data = copy.deepcopy(regulation().to_json())
    table = data
    for key in place[:-1]:
        table = table[key]
    table[place[-1]] = value
    with pytest.raises(TypeError):
        checked(TestResult.from_json(data))
