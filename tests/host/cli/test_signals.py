"""Signals while a load may be sinking: a stop is heard, and a pause is refused."""

from __future__ import annotations

import json
import os
import signal
import subprocess
import time

import pytest

from sinkwright.cli.signals import stopping_on_signals
from sinkwright.records import open_record
from sinkwright.stopping import StopRequest
from tests.host.cli.calling import PLAN, command, environment, write_plan

LONG = PLAN.replace("duration_s = 3.0", "duration_s = 60.0")


@pytest.mark.parametrize("number", [signal.SIGINT, signal.SIGTERM])
def test_a_first_and_a_second_signal_only_ask_to_stop(number, capfd):
    stop = StopRequest()
    with stopping_on_signals(stop, lambda: True):
        os.kill(os.getpid(), number)
        os.kill(os.getpid(), number)
    assert stop.requested
    assert "the load is being turned off" in capfd.readouterr().err


def test_a_pause_is_refused_while_sinking(capfd):
    with stopping_on_signals(StopRequest(), lambda: True):
        os.kill(os.getpid(), signal.SIGTSTP)
    assert "Not paused" in capfd.readouterr().err


def test_former_handlers_are_put_back():
    before = signal.getsignal(signal.SIGINT)
    with stopping_on_signals(StopRequest(), lambda: False):
        assert signal.getsignal(signal.SIGINT) is not before
    assert signal.getsignal(signal.SIGINT) is before


@pytest.mark.parametrize("number", [signal.SIGINT, signal.SIGTERM])
def test_a_run_that_is_stopped_leaves_with_130_and_an_interrupted_record(tmp_path, number):
    run = _start_long_run(tmp_path)
    _wait_until_it_sinks(run)
    run.send_signal(number)
    began_s = time.monotonic()
    rest, told = run.communicate(timeout=60)
    assert run.returncode == 130
    assert time.monotonic() - began_s < 30
    assert "Stopping" in told
    last = json.loads(rest.splitlines()[-1])
    assert last["tests"][0]["stopped_by"] == "interrupted"
    with open_record(last["record"]) as record:
        assert record.state == "interrupted"
        texts = [event.text for event in record.events()]
        assert texts.index("The load is off.") > texts.index("The load sinks 1.000 A.")


def _start_long_run(folder) -> subprocess.Popen[str]:
    """A run in real time on a simulated board, which ends only when it is stopped."""
    plan = write_plan(folder, text=LONG)
    return subprocess.Popen(
        command("run", plan, "--port", "sim:", "--out", folder, "--events"),
        stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True, env=environment(),
    )  # fmt: skip


def _wait_until_it_sinks(run: subprocess.Popen[str]) -> None:
    assert run.stdout is not None
    for line in run.stdout:
        if "The load sinks" in line:
            return
    pytest.fail(f"the run ended before it sank anything: {run.stderr.read() if run.stderr else ''}")
