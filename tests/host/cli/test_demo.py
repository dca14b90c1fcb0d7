"""The demonstration: the first thing that a person sees, so it must tell what it promises."""

from __future__ import annotations

import shlex
from pathlib import Path

import pytest

from sinkwright.definitions.loading import load_board, load_plan, load_source
from sinkwright.demo import demo_plan_path, demo_source_path
from sinkwright.procedures.preflight import preflight
from tests.host.cli.calling import Done, call_here


@pytest.fixture(scope="module")
def shown(tmp_path_factory) -> Done:
    return call_here("demo", "--out", tmp_path_factory.mktemp("demo"))


def test_it_leaves_with_0_although_its_verdicts_differ(shown):
    assert shown.returncode == 0
    assert "PASS" in shown.stdout
    assert "INCONCLUSIVE" in shown.stdout


def test_every_verdict_has_its_reason_and_an_inconclusive_one_its_remedy(shown):
    lines = shown.stdout.splitlines()
    for number, line in enumerate(lines):
        if line.startswith("   ") and line.endswith((": PASS", ": INCONCLUSIVE")):
            assert "±" in lines[number + 1]
        if line.startswith("   ") and line.endswith(": INCONCLUSIVE"):
            assert "Calibrate the board" in lines[number + 2]


def test_it_says_simulated_before_anything_and_with_the_results(shown):
    assert "SIMULATED" in shown.stdout.split("\n\n")[0]
    assert "SIMULATED: nothing here was measured on a real source." in shown.stdout
    assert "SIMULATED board" in shown.stderr


def test_record_and_report_lie_where_it_says(shown):
    paths = [
        line.partition(": ")[2] for line in shown.stdout.splitlines() if line.startswith(("Record", "Report"))
    ]
    assert [Path(path).suffix for path in paths] == [".sqlite", ".html"]
    assert all(Path(path).stat().st_size > 10_000 for path in paths)


def test_it_ends_with_three_commands_that_need_no_activated_environment(shown):
    commands = [
        shlex.split(line) for line in shown.stdout.split("To go on")[1].splitlines() if line.startswith("  ")
    ]
    opening, running, writing = [words for words in commands if words[0] != "#"]
    assert Path(opening[-1].removeprefix("file://")).is_file()
    assert Path(running[0]).is_absolute()
    assert Path(running[0]).exists()
    assert running[-2:] == ["--port", "sim:"]
    assert writing[-3:] == ["template", "plan", "load-regulation"]


def test_its_files_are_valid_and_its_plan_has_nothing_to_warn_about():
    load_source(demo_source_path())
    assert preflight(load_plan(demo_plan_path()), load_board()).warnings == ()
