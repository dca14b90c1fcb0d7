"""A served board: reached by pseudo-terminal and TCP, at the wall clock's pace, whatever its clients do."""

from __future__ import annotations

import json
import os
import select
import signal
import socket
import subprocess
import sys
import time
from itertools import pairwise

import pytest
import serial

from sinkwright.definitions import load_board, parse_source
from sinkwright.errors import LinkLost
from sinkwright.simulator.launcher import SimulatedBoard
from sinkwright.simulator.listeners import open_listener
from sinkwright.simulator.serve import Server
from sinkwright_wire.conversation import Conversation, Push, Reply
from sinkwright_wire.messages import HelloReply, SetTelemetry, Telemetry

STEPS_PER_TENTH = 43


class Served:
    """`simulate` in a process of its own; the URL is its first line."""

    def __init__(self, *options: str) -> None:
        self.process = subprocess.Popen(
            [sys.executable, "-m", "sinkwright", "simulate", *options],
            stdout=subprocess.PIPE,
            stderr=subprocess.PIPE,
            text=True,
        )
        assert self.process.stdout is not None
        self.first_line = self.process.stdout.readline().rstrip("\n")

    def end(self, number: int = signal.SIGINT) -> tuple[int, str, str]:
        """Exit code, the rest of stdout, and stderr."""
        self.process.send_signal(number)
        out, err = self.process.communicate(timeout=20)
        return self.process.returncode, out, err

    def __enter__(self) -> Served:
        return self

    def __exit__(self, *_: object) -> None:
        if self.process.poll() is None:
            self.process.kill()
        self.process.communicate()


class Client:
    """The least serial program: hello, telemetry, and what came, by way of any pyserial URL."""

    def __init__(self, url: str) -> None:
        self.port = serial.serial_for_url(url, timeout=0.02)
        self.conversation = Conversation(session=os.getpid() & 0xFFFF or 1)
        self.telemetry: list[Telemetry] = []

    def ask(self, sent: bytes, limit_s: float = 5.0):
        self.port.write(sent)
        end_s = time.monotonic() + limit_s
        while time.monotonic() < end_s:
            for reply in self.hear():
                return reply
        raise AssertionError("no answer")

    def hear(self):
        happened = self.conversation.receive(self.port.read(1) + self.port.read(self.port.in_waiting))
        for one in happened:
            if isinstance(one, Push) and isinstance(one.message, Telemetry):
                self.telemetry.append(one.message)
        return [one.message for one in happened if isinstance(one, Reply)]

    def watch(self, wall_s: float) -> list[Telemetry]:
        self.ask(self.conversation.request(SetTelemetry(STEPS_PER_TENTH)))
        self.telemetry.clear()
        end_s = time.monotonic() + wall_s
        while time.monotonic() < end_s:
            self.hear()
        return list(self.telemetry)


@pytest.mark.parametrize("listen", ["pty", "tcp:0"])
def test_hello_and_telemetry_pass_in_real_time(listen):
    with Served("--listen", listen) as served:
        client = Client(served.first_line)
        hello = client.ask(client.conversation.hello())
        assert isinstance(hello, HelloReply)
        assert hello.simulated
        seen = client.watch(1.5)
        client.port.close()
        code, rest, told = served.end()
    assert 11 <= len(seen) <= 17
    passed_s = (seen[-1].time_us - seen[0].time_us) / 1e6
    assert passed_s == pytest.approx(0.1 * (len(seen) - 1), rel=0.02)
    assert code == 130
    assert rest == ""
    assert "SIMULATED" in told
    assert "Traceback" not in told


def test_json_is_one_object_that_names_what_is_simulated():
    with Served("--listen", "tcp:0", "--json", "--speed", "max", "--seed", "9") as served:
        facts = json.loads(served.first_line)
        code, rest, _ = served.end(signal.SIGTERM)
    assert facts["simulated"] is True
    assert facts["url"].startswith("socket://127.0.0.1:")
    assert (facts["speed"], facts["seed"], facts["board"]) == ("max", 9, "perfboard-4A")
    assert facts["interpreter"] in ("MicroPython", "CPython")
    assert (code, rest) == (130, "")


def test_a_host_beyond_this_machine_is_said_to_have_no_authentication():
    with Served("--listen", "tcp:0.0.0.0:0") as served:
        assert served.process.stderr is not None
        told = served.process.stderr.readline() + served.process.stderr.readline()
        served.end()
    assert "there is no authentication" in told


def test_clients_may_come_one_after_the_other_and_together():
    with Served("--listen", "tcp:0") as served:
        for _ in range(2):
            client = Client(served.first_line)
            assert isinstance(client.ask(client.conversation.hello(watch=True)), HelloReply)
            client.port.close()
        both = [Client(served.first_line) for _ in range(2)]
        for client in both:
            assert isinstance(client.ask(client.conversation.hello(watch=True)), HelloReply)
        for client in both:
            client.port.close()


def test_above_real_time_it_waits_for_the_next_request_after_half_the_silence_limit():
    with Served("--listen", "tcp:0", "--speed", "max") as served:
        client = Client(served.first_line)
        client.ask(client.conversation.hello())
        idle = client.watch(0.5)
    passed_s = (idle[-1].time_us - idle[0].time_us) / 1e6
    assert 1.0 < passed_s <= 1.5


@pytest.mark.parametrize(
    ("option", "value", "told"),
    [
        ("--listen", "udp:1", "is no place to listen"),
        ("--listen", "tcp:none", "is no place to listen"),
        ("--speed", "0", "is no speed"),
        ("--speed", "nan", "is no speed"),
        ("--seed", "-1", "-1"),
        ("--source", "missing.toml", "missing.toml"),
        ("--board", "missing.toml", "missing.toml"),
    ],
)
def test_an_option_that_cannot_be_used_is_told_in_one_paragraph(option, value, told):
    with Served(option, value) as served:
        _, err = served.process.communicate(timeout=20)
    assert served.process.returncode == 2
    assert served.first_line == ""
    assert told in err
    assert "Traceback" not in err


def test_a_port_that_is_taken_is_told():
    with socket.create_server(("127.0.0.1", 0)) as taken:
        number = taken.getsockname()[1]
        with Served("--listen", f"tcp:{number}") as served:
            _, err = served.process.communicate(timeout=20)
    assert served.process.returncode == 2
    assert f"port {number} of 127.0.0.1 cannot be listened on" in err


TALKER = """
def run(board):
    at = board.clock.ticks_us()
    count = 0
    buffer = bytearray(64)
    while True:
        at = board.clock.add(at, 1000)
        board.clock.wait_until(at)
        count += board.stream.read_into(buffer)
        line = b"<%08d %08d" % (at // 1000, count) + b"." * 80 + b">"
        if board.stream.room() >= len(line):
            board.stream.write(line)
"""
LINE = 99


@pytest.fixture
def talker(tmp_path):
    """A stand-in firmware that says its clock (ms) and how many bytes it has read, 1000 times a second."""
    (tmp_path / "main.py").write_text(TALKER)
    source = parse_source('kind = "supply"\nvoltage_V = 12.0\nresistance_ohm = 0.05')
    board = SimulatedBoard.start(source, load_board(), 1, firmware=tmp_path)
    yield board
    board.close()


def serve_for(server: Server, wall_s: float) -> None:
    end_s = time.monotonic() + wall_s
    while time.monotonic() < end_s:
        server.turn()


@pytest.mark.parametrize("listen", ["pty", "tcp:0"])
def test_a_client_that_does_not_read_never_stops_the_board_and_frames_stay_whole(talker, listen):
    listener = open_listener(listen)
    server = Server(talker, listener, speed=1.0, silence_us=3_000_000)
    port = serial.serial_for_url(listener.url, timeout=0)
    held_s = 0.0
    while not held_s:
        serve_for(server, 0.5)
        held_s = listener.stuck_for_s()
    before_us = talker.board_time_us
    serve_for(server, 0.5)
    assert talker.board_time_us - before_us == pytest.approx(500_000, abs=100_000)
    text = b""
    for _ in range(200):
        serve_for(server, 0.01)
        text += port.read(1 << 20)
    port.close()
    listener.close()
    lines = text.split(b">")[:-1]
    assert {len(line) + 1 for line in lines} == {LINE}
    numbers = [int(line[1:9]) for line in lines]
    assert numbers == sorted(numbers)
    gap = max(later - earlier for earlier, later in pairwise(numbers))
    assert gap > 400


def test_above_real_time_the_board_waits_for_a_client_that_reads_slowly(talker):
    listener = open_listener("pty")
    server = Server(talker, listener, speed=100.0, silence_us=3_000_000)
    port = serial.serial_for_url(listener.url, timeout=0)
    text = b""
    end_s = time.monotonic() + 3.0
    while time.monotonic() < end_s:
        port.write(b"~")
        for _ in range(5):
            server.turn()
        text += port.read(500)
    port.close()
    listener.close()
    numbers = [int(line[1:9]) for line in text.split(b">")[:-1]]
    assert len(numbers) > 100
    assert numbers == list(range(numbers[0], numbers[0] + len(numbers)))


def test_a_client_that_floods_the_board_is_held_up_and_the_board_goes_on(talker):
    listener = open_listener("tcp:0")
    server = Server(talker, listener, speed=1.0, silence_us=3_000_000)
    host, port = listener.url.removeprefix("socket://").split(":")
    with socket.create_connection((host, int(port))) as flooding:
        flooding.setblocking(False)
        sent, text = 0, b""
        end_s = time.monotonic() + 1.0
        while time.monotonic() < end_s:
            if select.select([], [flooding], [], 0)[1]:
                sent += flooding.send(bytes(65536))
            server.turn()
            if select.select([flooding], [], [], 0)[0]:
                text += flooding.recv(1 << 20)
        listener.close()
    said_ms, read = (int(part) for part in text.split(b">")[-2][1:18].split())
    assert said_ms == pytest.approx(1000, abs=200)
    assert 10_000 < read < 30_000
    assert sent > 10 * read


def test_a_board_that_dies_ends_the_serving(talker):
    listener = open_listener("tcp:0")
    server = Server(talker, listener, speed=1.0, silence_us=3_000_000)
    serve_for(server, 0.05)
    talker._child._process.kill()
    with pytest.raises(LinkLost):
        serve_for(server, 2.0)
    listener.close()
