"""`run` on the true firmware and a simulated source, by its exit codes, its JSON and its files."""

from __future__ import annotations

import json

import pytest

from sinkwright.records import open_record
from tests.host.cli.calling import PLAN, assert_one_paragraph, call, printed_json, run_plan, write_plan


@pytest.mark.parametrize(
    ("accept", "code", "verdict"),
    [
        ("", 0, "none"),
        ("accept.voltage_V = { min = 11.0 }\n", 0, "pass"),
        ("accept.voltage_V = { max = 11.0 }\n", 1, "fail"),
        ("accept.voltage_V = { min = 12.04 }\n", 4, "inconclusive"),
    ],
)
def test_the_exit_code_is_the_verdict(tmp_path, accept, code, verdict):
    done = run_plan(write_plan(tmp_path, accept), tmp_path, "--json")
    result = printed_json(done)
    assert (done.returncode, result["verdict"]) == (code, verdict)
    assert result["simulated"] is True
    assert result["tests"][0]["stopped_by"] == "duration_s"


def test_record_and_report_are_there_and_say_what_was_tested(tmp_path):
    done = run_plan(
        write_plan(tmp_path), tmp_path / "out", "--json", "--item", "unit 3", "--operator", "someone"
    )
    path = tmp_path / "out" / printed_json(done)["record"].rpartition("/")[2]
    with open_record(path) as record:
        assert record.header.item == "unit 3"
        assert record.header.operator == "someone"
        assert record.header.simulated
        assert record.state == "complete"
    assert "SIMULATED" in path.with_suffix(".html").read_text()


def test_for_people_results_are_sentences_on_stdout_and_progress_is_on_stderr(tmp_path):
    done = run_plan(write_plan(tmp_path, "accept.voltage_V = { min = 11.0 }\n"), tmp_path)
    assert "SIMULATED" in done.stdout
    assert "Voltage: 12.0" in done.stdout
    assert "PASS" in done.stdout
    assert "1/1 hold ..." in done.stderr


def test_events_are_one_object_a_line_and_the_result_is_the_last(tmp_path):
    done = run_plan(write_plan(tmp_path), tmp_path, "--events")
    lines = [json.loads(line) for line in done.stdout.splitlines()]
    assert lines[0]["event"] == "run-begins"
    assert {"doing", "reading", "test-begins", "test-ends", "kept"} <= {line.get("event") for line in lines}
    assert lines[-1]["plan"] == "small-plan"


def test_check_tells_what_a_run_would_do_and_opens_nothing(tmp_path):
    done = call("run", write_plan(tmp_path), "--check", "--port", "/dev/nothing-here")
    assert done.returncode == 0
    assert "hold: draws up to 1.000 A (12.0 W)" in done.stdout


def test_a_fault_ends_with_3_and_what_was_measured_is_kept(tmp_path):
    # A source that wanders slowly past the plan's voltage limit: 12 V and up to half a volt more, within 5 s.
    (tmp_path / "wandering.toml").write_text(
        'kind = "supply"\nvoltage_V = 12.0\nresistance_ohm = 0.05\nripple_V = 1.0\nripple_Hz = 0.05\n'
    )
    plan = PLAN.replace("[[test]]", "[limits]\nvoltage_V = 12.4\n\n[[test]]").replace("= 3.0", "= 30.0")
    port = f"sim:{tmp_path}/wandering.toml,speed=max"
    done = call("run", write_plan(tmp_path, text=plan), "--port", port, "--out", tmp_path, "--json")
    assert done.returncode == 3
    (test,) = printed_json(done)["tests"]
    assert test["stopped_by"] == "over-voltage"
    assert test["quantities"]["voltage_V"]["value"] == pytest.approx(12.2, abs=0.2)
    with open_record(tmp_path / printed_json(done)["record"].rpartition("/")[2]) as record:
        assert record.state == "fault"
        assert record.results()[0].stopped_by == "over-voltage"


def test_a_run_that_gets_too_hot_is_throttled_by_the_board_and_inconclusive(tmp_path):
    hot = PLAN.replace("[[test]]", "[limits]\nheatsink_degC = 35.0\n\n[[test]]").replace(
        "current_A = 1.0\nduration_s = 3.0", "current_A = 2.0\nduration_s = 3000.0"
    )
    done = run_plan(write_plan(tmp_path, text=hot), tmp_path, "--json")
    assert done.returncode == 4
    (test,) = printed_json(done)["tests"]
    assert test["stopped_by"] == "derated"
    assert test["quantities"]["voltage_V"]["value"] == pytest.approx(12.03, abs=0.1)


@pytest.mark.parametrize(
    ("change", "told"),
    [
        (("current_A = 1.0", "curent_A = 1.0"), "curent_A"),
        (('kind = "hold"', 'kind = "juggle"'), "juggle"),
        (("current_A = 1.0", "current_A = 9.0"), "4 A"),
        (("current_A = 1.0", 'current_A = "one"'), "current_A"),
        (("duration_s = 3.0", "duration_s = nan"), "duration_s"),
        (("current_A = 1.0", "current_A = 2.5"), "rated 2 A"),
    ],
)
def test_a_plan_that_cannot_be_carried_out_is_one_paragraph_and_2(tmp_path, change, told):
    done = run_plan(write_plan(tmp_path, text=PLAN.replace(*change)), tmp_path)
    assert done.returncode == 2
    assert_one_paragraph(done)
    assert told in done.stderr
    assert "No load was touched." in done.stderr


def test_a_missing_plan_is_one_paragraph_and_2(tmp_path):
    done = run_plan(tmp_path / "nowhere.toml", tmp_path)
    assert done.returncode == 2
    assert_one_paragraph(done)


def test_a_folder_that_cannot_be_written_is_one_paragraph_and_2(tmp_path):
    (tmp_path / "file").write_text("not a folder")
    done = run_plan(write_plan(tmp_path), tmp_path / "file" / "out")
    assert done.returncode == 2
    assert_one_paragraph(done)


def test_a_source_that_is_switched_off_is_told_before_anything_is_drawn(tmp_path):
    (tmp_path / "off.toml").write_text('kind = "supply"\nvoltage_V = 0.01\nresistance_ohm = 0.05\n')
    done = call(
        "run", write_plan(tmp_path), "--port", f"sim:{tmp_path}/off.toml,speed=max", "--out", tmp_path
    )
    assert done.returncode == 2
    assert "no source is seen" in done.stderr


def test_a_plan_that_asks_for_a_person_does_not_ask_on_a_simulated_board(tmp_path):
    done = run_plan(write_plan(tmp_path, 'instruction = "Turn the knob to 12 V."\n'), tmp_path)
    assert done.returncode == 0
    assert "nobody has to do it" in done.stderr
