"""One cell, the laptop gone: the host dies in the middle of a discharge, the board ends it, `resume` makes it whole.

At real time, because a simulated board never runs far ahead of its host: after the last request it would stand still.
"""

from __future__ import annotations

import json
import signal
import subprocess
import time
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import pytest

from sinkwright.records import open_record
from tests.host.cli.calling import command, environment

CELL = """\
kind = "cell"
capacity_Ah = 0.004
ocv = [[0.0, 2.9], [0.1, 3.4], [0.5, 3.7], [1.0, 4.18]]
r0_ohm = 0.03
"""
# From full, 2 A empty the cell to 5 % in 6.8 s: beyond the silence limit of 3 s from any moment of the first three.
PLAN = """\
when_host_silent = "continue"
[source]
rated_voltage_V = 3.7
[[test]]
kind = "hold"
current_A = 2.0
end_voltage_V = 3.1
duration_s = 60.0
accept.capacity_Ah = { min = 0.003 }
"""
PATIENCE_s = 30.0


class Desk:
    """A folder with a cell and a plan, a home for records, and the simulated board served in it."""

    def __init__(self, folder: Path) -> None:
        self.folder = folder
        cell, self.plan = folder / "cell.toml", folder / "plan.toml"
        cell.write_text(CELL)
        self.plan.write_text(PLAN)
        self.board = self.start("simulate", "--source", cell, "--listen", "tcp:0")
        assert self.board.stdout is not None
        self.url = self.board.stdout.readline().strip()

    def start(self, *arguments: str | Path) -> subprocess.Popen[str]:
        surroundings = environment(HOME=str(self.folder))
        pipes = {"stdout": subprocess.PIPE, "stderr": subprocess.PIPE}
        return subprocess.Popen(command(*arguments), env=surroundings, text=True, **pipes)

    def call(self, *arguments: str | Path) -> tuple[int, dict[str, Any]]:
        """A command with --json on the served board: its exit code and what it printed."""
        called = self.start(*arguments, "--port", self.url, "--json")
        printed, _ = called.communicate(timeout=PATIENCE_s)
        return called.returncode, json.loads(printed)

    def kill_in_the_middle(self) -> None:
        """Begin the discharge, and kill its host without letting it turn anything off."""
        host = self.start("run", self.plan, "--port", self.url, "--events")
        assert host.stdout is not None
        for line in host.stdout:
            if "The load sinks" in line:
                break
        time.sleep(1.5)
        host.send_signal(signal.SIGKILL)
        host.communicate()

    def close(self) -> None:
        self.board.terminate()
        self.board.communicate()


@pytest.fixture
def desk(tmp_path: Path) -> Iterator[Desk]:
    desk = Desk(tmp_path)
    yield desk
    desk.close()


def test_a_discharge_whose_host_is_killed_ends_by_itself_and_is_fetched_whole(desk: Desk) -> None:
    desk.kill_in_the_middle()

    code, refused = desk.call("run", desk.plan)
    assert (code, refused["error"].split(",")[0]) == (2, "a run goes on by itself on this board")

    until_s = time.monotonic() + PATIENCE_s
    while True:
        code, told = desk.call("resume")
        if code != 2 or time.monotonic() > until_s:
            break
        assert "still goes on" in told["error"]
        time.sleep(0.5)

    assert (code, told["verdict"]) == (0, "pass")
    (test,) = told["tests"]
    assert test["stopped_by"] == "end_voltage_V"
    found = {name: quantity["value"] for name, quantity in test["quantities"].items()}
    # The open voltage at 3.16 V is 5 % of charge, by the cell's table and its 0.03 ohm.
    assert found["capacity_Ah"] == pytest.approx(0.004 * (1 - 0.052), rel=0.03)
    assert found["duration_s"] == pytest.approx(found["capacity_Ah"] * 3600 / 2.0, rel=0.02)
    (path,) = desk.folder.glob("sinkwright/*.sqlite")
    assert told["record"] == str(path)
    assert Path(told["report"]).is_file()
    with open_record(path) as record:
        assert record.state == "complete"
        last_us = max(sample.time_us for sample in record.samples())
        kept = [entry for entry in record.board_log() if entry.missed]
        # The coarser stretch begins where the samples end, and reaches to the end of the run.
        assert 0 < kept[0].time_us - last_us <= 1_100_000
        assert kept[-1].charge_uC == pytest.approx(found["capacity_Ah"] * 3.6e9, rel=0.01)
        assert len(kept) == told["board_log_entries"] >= 3


def test_nothing_is_discharged_a_second_time_before_the_first_is_fetched(desk: Desk) -> None:
    desk.kill_in_the_middle()
    code, _ = desk.call("off")
    assert code == 0

    code, refused = desk.call("run", desk.plan)
    assert code == 2
    assert "has not been fetched" in refused["error"]

    code, told = desk.call("resume")
    assert (code, told["tests"][0]["stopped_by"]) == (3, "turned-off")
    with open_record(told["record"]) as record:
        assert record.state == "interrupted"
