"""`off` from a second terminal, while a run holds the board."""

from __future__ import annotations

import json
import subprocess

import pytest

from sinkwright.cli.off import in_words
from sinkwright.readings import LoadStatus
from sinkwright_wire.messages import Fault, Limiting, Mode, State
from tests.host.cli.calling import PLAN, call, command, environment, printed_json, write_plan

LONG = PLAN.replace("duration_s = 3.0", "duration_s = 60.0")


@pytest.fixture
def served_board():
    """The port URL of a simulated board that several programs share, as they would a serial line."""
    serving = subprocess.Popen(
        command("simulate", "--listen", "tcp:0", "--json"),
        stdout=subprocess.PIPE, stderr=subprocess.DEVNULL, text=True, env=environment(),
    )  # fmt: skip
    assert serving.stdout is not None
    yield json.loads(serving.stdout.readline())["url"]
    serving.terminate()
    serving.communicate(timeout=20)


def test_off_says_what_the_load_is_doing_afterwards(served_board):
    done = call("off", "--port", served_board)
    assert done.returncode == 0
    assert "SIMULATED" in done.stdout
    assert "The load is off; its terminals are at 12." in done.stdout


def test_off_from_a_second_terminal_ends_a_run_that_sinks(served_board, tmp_path):
    plan = write_plan(tmp_path, text=LONG)
    run = subprocess.Popen(
        command("run", plan, "--port", served_board, "--out", tmp_path, "--events"),
        stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True, env=environment(),
    )  # fmt: skip
    assert run.stdout is not None
    assert any("The load sinks" in line for line in run.stdout)
    assert call("off", "--port", served_board).returncode == 0
    rest, told = run.communicate(timeout=60)
    assert run.returncode == 3, told
    assert json.loads(rest.splitlines()[-1])["tests"][0]["stopped_by"] == "turned-off"


def test_off_as_json_is_one_object():
    told = printed_json(call("off", "--port", "sim:,speed=max", "--json"))
    assert told["off"] is True
    assert told["simulated"] is True


def test_off_at_a_port_where_nobody_answers_is_an_error():
    done = call("off", "--port", "/dev/nothing-here")
    assert done.returncode == 2
    assert "/dev/nothing-here" in done.stderr


@pytest.mark.parametrize(("current_A", "says"), [(0.0, "The load is off"), (1.5, "pull the source lead now")])
def test_current_that_flows_although_off_is_never_called_off(current_A, says):
    status = LoadStatus(
        time_us=0, state=State.OFF, mode=Mode.CURRENT, limiting=Limiting.NONE, fault=Fault.NONE,
        setpoint_SI=1.0, voltage_V=12.0, current_A=current_A, force_V=12.0, heatsink_degC=30.0,
        junction_degC=30.0, zero_current_A=0.0, zero_samples=64, controlled=False, overruns=0, dropped=0,
        discarded=0, log_entries=0,
    )  # fmt: skip
    assert says in in_words(status)
