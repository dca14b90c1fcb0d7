"""The shipped firmware on a simulated board that hangs under load, crashes, is interrupted, or is asked to restart.

Faults of the firmware itself are put in by lines added to a copy of it.
"""

from __future__ import annotations

import asyncio
import json
import shutil
from pathlib import Path

import pytest

from sinkwright.definitions import load_board, parse_source
from sinkwright.errors import BoardRefused
from sinkwright.firmware_files import find_firmware
from sinkwright.instrument import Instrument
from sinkwright.runner import drive
from sinkwright.simulator.launcher import SimulatedBoard
from sinkwright.simulator.memory import take_out
from sinkwright_wire.conversation import Push, RefusedReply, Reply
from sinkwright_wire.messages import (
    Enable,
    Event,
    FaultReport,
    GetFault,
    GetStatus,
    HelloReply,
    Identify,
    Identity,
    LogLine,
    Message,
    Refused,
    Restart,
    SetPoint,
    SetTelemetry,
    Status,
)
from sinkwright_wire.vocabulary import EventKind, Fault, Mode, Refusal, ResetCause, SelfTest, Silence, State

from . import test_launcher

SOURCE = parse_source('kind = "supply"\nvoltage_V = 12.0\nresistance_ohm = 0.05')

#: In the third second after a start from power-on, and not again after the restart.
IN_THE_THIRD_SECOND = """

_true_turn = Firmware.turn


def _turn(self):
    if self.time.seconds == 3 and self.commands._board.reset_cause == wire.RESET_POWER_ON:
        {happens}
    _true_turn(self)


Firmware.turn = _turn
"""
HANGS = "while True: self.time.wait()"


class Host(test_launcher.Host):
    """The least host there is, which takes a refusal for an answer."""

    def hear(self, wait_s: float) -> list[Message]:
        data = asyncio.run(self.channel.receive(wait_s))
        self.bytes += data
        happened = self.conversation.receive(data)
        self.pushes += [one.message for one in happened if isinstance(one, Push)]
        replies: list[Message] = [one.message for one in happened if isinstance(one, Reply)]
        return replies + [one.refused for one in happened if isinstance(one, RefusedReply)]


def altered(folder: Path, happens: str) -> Path:
    """A copy of the firmware in which `happens` happens."""
    copy = folder / "firmware"
    shutil.copytree(find_firmware(), copy)
    with (copy / "main.py").open("a") as main:
        main.write(IN_THE_THIRD_SECOND.format(happens=happens))
    return copy


def start(**options) -> Host:
    host = Host(SimulatedBoard.start(SOURCE, load_board(), 1, **options))
    host.ask()
    return host


def hear_until(host: Host, board_s: float) -> None:
    while host.channel.now_s() < board_s:
        host.hear(0.1)


def under_load(firmware: Path) -> Host:
    """Sinks 1.5 A; the moment before it happens."""
    host = start(firmware=firmware)
    host.ask(SetPoint(Mode.CURRENT, 1_500_000))
    host.ask(SetTelemetry(43))
    hear_until(host, 1.0)
    assert not isinstance(host.ask(Enable(Silence.STOP)), Refused)
    hear_until(host, 2.7)
    status = host.ask(GetStatus())
    assert isinstance(status, Status)
    assert status.state == State.SINKING
    assert status.current_uA > 1_400_000
    host.pushes.clear()
    return host


def greet_anew(host: Host) -> tuple[HelloReply, Identity, Status]:
    hello, identity, status = host.ask(), host.ask(Identify()), host.ask(GetStatus())
    assert isinstance(hello, HelloReply)
    assert isinstance(identity, Identity)
    assert isinstance(status, Status)
    return hello, identity, status


def told(host: Host) -> list[str]:
    """What the board says in words to each host that asks who it is, however late it comes."""
    return [push.text.replace(",)", ")") for push in host.pushes if isinstance(push, LogLine)]


def boots(host: Host) -> list[int]:
    """The reset causes that the board told by itself."""
    return [push.code for push in host.pushes if isinstance(push, Event) and push.kind == EventKind.BOOT]


def test_a_firmware_that_hangs_under_load_is_reset_by_the_watchdog_and_the_load_is_off(tmp_path: Path):
    host = under_load(altered(tmp_path, HANGS))
    hear_until(host, 6.5)
    hello, identity, status = greet_anew(host)
    host.channel.close()
    assert boots(host) == [ResetCause.WATCHDOG]
    assert hello.boot_number == 2
    assert identity.reset_cause == ResetCause.WATCHDOG
    assert (status.state, status.fault) == (State.OFF, Fault.NONE)
    # The off-current band of the shipped board is 60 mA; behind the clamp it is an offset that is read.
    assert abs(status.current_uA) < 60_000


def test_it_takes_the_watchdog_two_seconds_and_no_longer(tmp_path: Path):
    host = under_load(altered(tmp_path, HANGS))
    told_s = None
    while told_s is None:
        host.hear(0.01)
        if boots(host):
            told_s = host.channel.now_s()
    host.channel.close()
    # Two seconds from the last feeding, at most 38 ms before; the reset itself 0.3 s; then the self-test.
    assert 5.1 < told_s < 5.5


def test_an_exception_under_load_is_told_and_leads_to_a_maintenance_boot_that_does_not_sink(tmp_path: Path):
    host = under_load(altered(tmp_path, 'raise ValueError("a made-up error")'))
    hear_until(host, 4.5)
    hello, identity, status = greet_anew(host)
    refused = host.ask(Enable(Silence.STOP))
    fault = host.ask(GetFault())
    said = host.bytes
    host.channel.close()
    assert b"the firmware stopped, the gate is clamped: ValueError('a made-up error'" in said
    assert boots(host) == [ResetCause.EXCEPTION]
    assert identity.reset_cause == ResetCause.EXCEPTION
    assert hello.boot_number == 2
    assert (status.state, status.fault) == (State.FAULT, Fault.EXCEPTION)
    assert isinstance(refused, Refused)
    assert refused.refusal == Refusal.FAULT_LATCHED
    assert isinstance(fault, FaultReport)
    assert fault.standing
    assert told(host) == ["the firmware had stopped: ValueError('a made-up error')"]


def test_from_the_maintenance_boot_a_host_gets_the_board_back_by_a_restart(tmp_path: Path):
    host = under_load(altered(tmp_path, 'raise ValueError("a made-up error")'))
    hear_until(host, 4.5)
    host.ask()
    assert not isinstance(host.ask(Restart(False)), Refused)
    hear_until(host, 6.0)
    hello, identity, status = greet_anew(host)
    host.channel.close()
    assert hello.boot_number == 3
    assert identity.reset_cause == ResetCause.SOFT
    assert (status.state, status.fault) == (State.OFF, Fault.NONE)


def test_ctrl_c_under_load_clamps_and_ends_in_a_maintenance_boot(tmp_path: Path):
    host = under_load(altered(tmp_path, "raise KeyboardInterrupt"))
    hear_until(host, 4.5)
    _, identity, status = greet_anew(host)
    said = host.bytes
    host.channel.close()
    assert b"stopped by Ctrl-C: the gate is clamped" in said
    assert identity.reset_cause == ResetCause.SOFT
    assert (status.state, status.fault) == (State.OFF, Fault.NONE)


def test_a_board_without_its_adc_says_so_and_stays_off():
    host = start(defects=[{"kind": "adc_silent", "from_us": 0}])
    hear_until(host, 0.5)
    host.ask(SetPoint(Mode.CURRENT, 1_000_000))
    fault, refused = host.ask(GetFault()), host.ask(Enable(Silence.STOP))
    host.ask(Identify())
    host.channel.close()
    assert isinstance(fault, FaultReport)
    assert (fault.fault, fault.value, fault.standing) == (Fault.SELF_TEST, SelfTest.ADC, True)
    assert isinstance(refused, Refused)
    assert (refused.refusal, refused.detail) == (Refusal.BOARD_IMAGE, SelfTest.ADC)
    assert told(host) == ["self-test: the ADC does not answer: error 5"]


def test_what_the_board_remembers_outlasts_it_even_when_it_is_killed(tmp_path: Path):
    store = tmp_path / "board.json"
    for number in (1, 2, 3):
        board = SimulatedBoard.start(SOURCE, load_board(), 1, store)
        hello = Host(board).ask()
        assert isinstance(hello, HelloReply)
        assert hello.boot_number == number
        board._child._process.kill()
        board.close()
    memory = take_out(store, 1)
    assert memory.starts == 4
    texts = [json.loads(bytes.fromhex(slot)[9:-4]) for slot in memory.slots]
    assert sorted(text["boots"] for text in texts) == [2, 3]


def test_a_stored_calibration_lasts_from_one_start_to_the_next(tmp_path: Path):
    """Put there as the board's own store would, since nothing on the wire writes it yet."""
    store = tmp_path / "board.json"
    firmware = altered(
        tmp_path,
        "self.store.get('calibration') or self.store.put('calibration', dict("
        "number=7, **{name: dict(self.commands._board.image['scales'][name], offset=0)"
        " for name in ('current', 'voltage', 'force')}))",
    )
    host = start(store=store, firmware=firmware)
    hear_until(host, 3.5)
    host.channel.close()
    host = start(store=store)
    identity = host.ask(Identify())
    host.channel.close()
    assert isinstance(identity, Identity)
    assert identity.calibration_number == 7


def test_a_program_restarts_a_simulated_board_and_goes_on_with_it():
    load = drive(Instrument.open("sim:,speed=max"))
    first = load.identity.boot_number
    drive(load.set_current(0.5))
    drive(load.restart())
    assert load.identity.boot_number == first + 1
    assert load.identity.reset_cause == ResetCause.SOFT
    drive(load.set_current(0.5))
    drive(load.on())
    drive(load.off())
    drive(load.restart(maintenance=True))
    drive(load.set_current(0.5))
    with pytest.raises(BoardRefused):
        drive(load.on())
    drive(load.close())
