"""The files that `template` hands out: each is right as it stands, and explains every key."""

from __future__ import annotations

import re

import pytest

from sinkwright import templates
from sinkwright.definitions import parse_board, parse_plan, parse_source
from sinkwright.definitions.plan import KINDS as PLAN_KINDS
from sinkwright.definitions.source import KINDS as SOURCE_KINDS


def test_every_kind_has_a_template() -> None:
    assert set(templates.kinds("plan")) == set(PLAN_KINDS)
    assert set(templates.kinds("source")) == set(SOURCE_KINDS)


@pytest.mark.parametrize("kind", PLAN_KINDS)
def test_a_plan_template_is_a_plan_with_that_kind_and_bounds(kind: str) -> None:
    plan = parse_plan(templates.template("plan", kind), kind)
    assert kind in [test.kind for test in plan.tests]
    assert any(test.accept for test in plan.tests)


@pytest.mark.parametrize("kind", SOURCE_KINDS)
def test_a_source_template_is_that_kind(kind: str) -> None:
    assert parse_source(templates.template("source", kind)).kind == kind


def test_the_board_template_is_a_board() -> None:
    assert parse_board(templates.template("board")).name == "perfboard-4A"


@pytest.mark.parametrize(
    ("family", "kind"), [*(("plan", k) for k in PLAN_KINDS), *(("source", k) for k in SOURCE_KINDS)]
)
def test_keys_that_are_commented_out_are_right_too(family: str, kind: str) -> None:
    """A person takes the mark away and the line must do."""
    lines = templates.template(family, kind).splitlines()
    for number, line in enumerate(lines):
        if not re.match(r"# \w+ = ", line) or line.startswith("# foldback_A"):
            continue
        chosen = [*lines[:number], line[2:], *lines[number + 1 :]]
        if "ripple_V" in line:
            chosen[number + 1] = chosen[number + 1].removeprefix("# ")
        if "lead_resistance" in line:
            chosen = [re.sub(r"^# (lead_resistance)", r"\1", other) for other in chosen]
            chosen = [re.sub(r'sense = "remote"', 'sense = "two-wire"', other) for other in chosen]
        parse = parse_plan if family == "plan" else parse_source
        parse("\n".join(chosen))
