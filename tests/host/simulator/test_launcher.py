"""A simulated board that runs the shipped firmware: repeatable, and told when it dies."""

from __future__ import annotations

import asyncio
import subprocess
import sys
from pathlib import Path

import pytest

from sinkwright.definitions import load_board, parse_source
from sinkwright.errors import LinkLost
from sinkwright.simulator.interpreter import cpython, find_interpreter
from sinkwright.simulator.launcher import SimulatedBoard
from sinkwright.transport.lockstep import LockStepChannel
from sinkwright_wire.conversation import Conversation, Push, Reply
from sinkwright_wire.messages import (
    Enable,
    Event,
    HelloReply,
    Identify,
    Identity,
    Message,
    Request,
    SetPoint,
    SetTelemetry,
    Telemetry,
)
from sinkwright_wire.vocabulary import Mode, Silence

BOARD = load_board()
SOURCE = parse_source('kind = "supply"\nvoltage_V = 12.0\nresistance_ohm = 0.05\nleads_ohm = 0.02')
STEPS_PER_TENTH = 43


def start(seed: int = 1, **options) -> SimulatedBoard:
    return SimulatedBoard.start(SOURCE, BOARD, seed, **options)


class Host:
    """The least host there is: one conversation over one lock-step channel, keeping every byte."""

    def __init__(self, board: SimulatedBoard) -> None:
        self.channel = LockStepChannel("sim:", board)
        self.conversation = Conversation(session=77)
        self.bytes = b""
        self.pushes: list[Message] = []

    def ask(self, message: Request | None = None) -> Message:
        sent = self.conversation.request(message) if message else self.conversation.hello()
        self.channel.send(sent)
        for _ in range(10):
            for reply in self.hear(0.1):
                return reply
        raise AssertionError(f"no answer to {message}")

    def hear(self, wait_s: float) -> list[Message]:
        """Replies within `wait_s`; pushes are kept."""
        data = asyncio.run(self.channel.receive(wait_s))
        self.bytes += data
        happened = self.conversation.receive(data)
        self.pushes += [one.message for one in happened if isinstance(one, Push)]
        return [one.message for one in happened if isinstance(one, Reply)]


def short_session(seed: int, **options) -> Host:
    """1.5 A for two seconds, told ten times a second."""
    board = start(seed, **options)
    host = Host(board)
    try:
        host.ask()
        host.ask(SetPoint(Mode.CURRENT, 1_500_000))
        host.ask(SetTelemetry(STEPS_PER_TENTH))
        while host.channel.now_s() < 1.0:
            host.hear(0.1)
        host.ask(Enable(Silence.STOP))
        while host.channel.now_s() < 2.5:
            host.hear(0.1)
    finally:
        board.close()
    return host


def telemetry(host: Host) -> list[Telemetry]:
    return [push for push in host.pushes if isinstance(push, Telemetry)]


def test_the_shipped_firmware_says_who_it_is_and_that_it_is_simulated():
    board = start(seed=4)
    host = Host(board)
    hello, identity = host.ask(), host.ask(Identify())
    board.close()
    assert isinstance(hello, HelloReply)
    assert isinstance(identity, Identity)
    assert hello.simulated
    assert hello.name == "perfboard-4A"
    assert identity.interpreter.startswith(board.interpreter)
    assert isinstance(host.pushes[0], Event)


def test_it_sinks_the_current_that_was_asked_for_within_its_tolerances():
    """Ohm's law for the source: 12 V behind 50 mohm, sensed at its terminals; the shipped tolerances."""
    last = telemetry(short_session(seed=1))[-1]
    assert last.current_uA == pytest.approx(1_500_000, rel=0.01, abs=25_000)
    volt = 12.0 - 0.05 * 1.5
    assert last.voltage_uV / 1e6 == pytest.approx(volt, rel=0.0045, abs=0.085)


def test_equal_seeds_give_equal_bytes_and_different_seeds_do_not():
    first, again, other = (short_session(seed).bytes for seed in (1, 1, 2))
    assert len(first) > 1000
    assert first == again
    assert first != other


def test_equal_seeds_give_equal_bytes_while_other_processes_burn_the_machine():
    quiet = short_session(seed=3).bytes
    burner = [sys.executable, "-c", "while True: pass"]
    burning = [subprocess.Popen(burner) for _ in range(4)]
    try:
        loaded = short_session(seed=3).bytes
    finally:
        for process in burning:
            process.kill()
            process.wait()
    assert loaded == quiet


def test_different_seeds_read_the_same_source_differently():
    volts = {telemetry(short_session(seed))[-1].voltage_uV for seed in (1, 2, 3)}
    assert len(volts) == 3


def test_cpython_runs_the_same_firmware_to_the_same_readings_and_says_so():
    """Where MicroPython has no wheel. Floats of both are IEEE 754 doubles, so the readings agree."""
    board = start(interpreter=cpython())
    host = Host(board)
    host.ask()
    identity = host.ask(Identify())
    board.close()
    assert isinstance(identity, Identity)
    assert board.interpreter == "CPython"
    assert identity.interpreter.startswith("CPython")
    assert telemetry(short_session(1)) == telemetry(short_session(1, interpreter=cpython()))


def test_byte_code_and_machine_code_of_the_firmware_say_the_same_bytes():
    """The simulated board compiles the files to machine code where it can; a real one runs their byte code."""
    assert short_session(1).bytes == short_session(1, interpreter=find_interpreter(native=False)).bytes


def test_a_killed_board_is_lost_and_told():
    board = start()
    board.exchange(b"", 1000)
    board._child._process.kill()
    with pytest.raises(LinkLost, match="The simulated load is gone with it"):
        board.exchange(b"", 1000)
    board.close()
    assert board._child._process.returncode == -9


def test_firmware_that_fails_is_told_with_its_own_last_lines(tmp_path):
    (tmp_path / "main.py").write_text("def run(board):\n    board.nonsense()\n")
    board = start(firmware=tmp_path)
    with pytest.raises(LinkLost) as caught:
        board.exchange(b"", 100_000)
    assert "AttributeError" in str(caught.value)


def test_any_firmware_meets_a_clock_a_bus_and_a_stream(tmp_path):
    """The seam alone, with a firmware that echoes in each step."""
    (tmp_path / "main.py").write_text(
        "def run(board):\n"
        "    buffer = bytearray(16)\n"
        "    at = board.clock.ticks_us()\n"
        "    while True:\n"
        "        at = board.clock.add(at, 1000)\n"
        "        board.clock.wait_until(at)\n"
        "        count = board.stream.read_into(buffer)\n"
        "        if count:\n"
        "            board.stream.write(buffer[:count])\n"
    )
    board = start(firmware=tmp_path)
    assert board.exchange(b"", 10_000) == (b"", 10_000)
    assert board.exchange(b"echo", 10_000)[0] == b"echo"
    assert board.board_time_us <= 12_000
    sent = bytes(range(256)) * 300
    answer = board.exchange(sent, 0)[0]
    while more := board.exchange(b"", 10_000)[0]:
        answer += more
    assert answer == sent
    board.close()


def boot_number(**options) -> int:
    board = start(**options)
    hello = Host(board).ask()
    board.close()
    assert isinstance(hello, HelloReply)
    return hello.boot_number


def test_a_store_counts_the_boots_and_without_one_every_start_is_the_same(tmp_path: Path):
    store = tmp_path / "board.json"
    assert [boot_number(store=store), boot_number(store=store)] == [1, 2]
    assert boot_number() == boot_number()


def test_a_defect_of_the_circuit_reaches_the_firmware():
    board = start(defects=[{"kind": "adc_silent", "from_us": 500_000}])
    host = Host(board)
    host.ask()
    while host.channel.now_s() < 1.0:
        host.hear(0.1)
    board.close()
    assert any(isinstance(push, Event) and push.kind.name == "FAULT" for push in host.pushes)


def test_the_interpreter_of_this_machine_is_the_one_used():
    board = start()
    assert board.interpreter == find_interpreter().name
    board.close()
