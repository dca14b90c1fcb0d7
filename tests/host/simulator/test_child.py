"""A child process at the end of two pipes: whole answers, a told end, and nothing left behind."""

from __future__ import annotations

import os
import signal
import subprocess
import sys
import textwrap
import time
import warnings
from pathlib import Path

import pytest

from sinkwright.errors import LinkLost
from sinkwright.simulator import child as child_module
from sinkwright.simulator.child import Child

ECHO = """
    import struct, sys, time
    line = sys.stdin.buffer.readline().strip()
    clock = 0
    while True:
        head = sys.stdin.buffer.read(6)
        if len(head) < 6:
            sys.exit(0)
        grant, count = struct.unpack("<IH", head)
        data = sys.stdin.buffer.read(count)
        clock += grant
        if data.startswith(b"exit"):
            print("first line\\nlast words", file=sys.stderr)
            sys.exit(int(data[4:]))
        if data.startswith(b"hang"):
            time.sleep(60)
        answer = struct.pack("<QH", clock, len(line + data)) + line + data
        for start in range(0, len(answer), 7 if data.startswith(b"bits") else 1 << 20):
            sys.stdout.buffer.write(answer[start : start + (7 if data.startswith(b"bits") else 1 << 20)])
            sys.stdout.buffer.flush()
            if data.startswith(b"bits"):
                time.sleep(0.002)
"""


@pytest.fixture
def child():
    started = Child([sys.executable, "-I", "-S", "-c", textwrap.dedent(ECHO)], b"> \n", "simulated board")
    yield started
    started.close()


def test_bytes_and_time_go_over_and_come_back(child):
    assert child.exchange(b"one", 1500) == (b">one", 1500)
    assert child.exchange(b"", 500) == (b">", 2000)


def test_an_answer_that_comes_in_pieces_is_put_together(child):
    assert child.exchange(b"bits and pieces of an answer", 10) == (b">bits and pieces of an answer", 10)


def test_the_largest_exchange_fits(child):
    most = bytes(65534)
    assert child.exchange(most, 1) == (b">" + most, 1)


def test_a_child_that_ends_is_told_with_its_exit_code_and_its_last_words(child):
    with pytest.raises(LinkLost) as caught:
        child.exchange(b"exit3", 1)
    assert "ended by itself (exit code 3); its last lines were:\nfirst line\nlast words" in str(caught.value)
    assert "The simulated load is gone with it." in str(caught.value)


def test_a_child_that_was_killed_is_told_again_at_every_later_exchange(child):
    child.exchange(b"", 1)
    child._process.kill()
    for _ in range(2):
        with pytest.raises(LinkLost, match=r"ended by itself \(signal 9\)"):
            child.exchange(b"", 1)


def test_a_child_that_hangs_is_given_up_and_killed(child, monkeypatch):
    monkeypatch.setattr(child_module, "PATIENCE_S", 0.2)
    monkeypatch.setattr(child_module, "_LEAVE_S", 0.2)
    with pytest.raises(LinkLost, match="has not answered for"):
        child.exchange(b"hang", 1)
    assert child._process.returncode == -signal.SIGKILL


def test_closing_waits_for_the_child_and_may_be_repeated(child):
    child.close()
    child.close()
    assert child._process.returncode == 0
    with pytest.raises(LinkLost, match="was closed"):
        child.exchange(b"", 1)


def test_a_child_that_is_forgotten_is_ended_and_waited_for():
    forgotten = Child([sys.executable, "-I", "-S", "-c", textwrap.dedent(ECHO)], b"\n", "simulated board")
    process = forgotten._process
    with warnings.catch_warnings():
        warnings.simplefilter("error")
        del forgotten
    assert process.returncode == 0


def test_a_child_ends_when_its_parent_is_killed():
    script = textwrap.dedent("""
        import sys, time
        from sinkwright.simulator.child import Child
        child = Child([sys.executable, "-I", "-S", "-c", sys.argv[1]], b"\\n", "simulated board")
        child.exchange(b"", 1)
        print(child._process.pid, flush=True)
        time.sleep(60)
    """)
    command = [sys.executable, "-c", script, textwrap.dedent(ECHO)]
    with subprocess.Popen(command, stdout=subprocess.PIPE, text=True) as parent:
        assert parent.stdout is not None
        grandchild = int(parent.stdout.readline())
        parent.kill()
    assert gone_within(grandchild, 5.0)


def gone_within(process: int, limit_s: float) -> bool:
    end_s = time.monotonic() + limit_s
    while time.monotonic() < end_s:
        try:
            os.kill(process, 0)
        except ProcessLookupError:
            return True
        time.sleep(0.02)
    return is_zombie(process)


def is_zombie(process: int) -> bool:
    """Ended, and only not yet waited for by whoever inherited it (some containers run no init)."""
    try:
        return Path(f"/proc/{process}/stat").read_text().rpartition(")")[2].split()[0] == "Z"
    except OSError:
        return True


def test_an_interrupt_while_the_child_works_loses_no_byte_of_its_answers(child):
    """As Ctrl-C does it to a host that then still has to turn the load off."""

    def interrupt(number, frame):
        raise KeyboardInterrupt

    former = signal.signal(signal.SIGALRM, interrupt)
    try:
        signal.setitimer(signal.ITIMER_REAL, 0.02)
        with pytest.raises(KeyboardInterrupt):
            child.exchange(b"bits" * 40, 1)
    finally:
        signal.signal(signal.SIGALRM, former)
    first, _ = child.exchange(b"after", 1)
    second, _ = child.exchange(b"", 1)
    assert first + second == b">" + b"bits" * 40 + b">after"
