"""A process that is fed bytes and simulated time, and answers with bytes and its own time.

Decides how the pipes are read, what happens when the process ends by itself or hangs, and that it never
outlives its user. It must not know what is simulated: the first line and the bytes are handed through as
they come.

    host -> child   "<IH" grant in microseconds, count; the bytes
    child -> host   "<QH" board time in microseconds, count; the bytes
"""

from __future__ import annotations

import contextlib
import os
import select
import struct
import subprocess
import tempfile
import weakref
from collections.abc import Sequence
from typing import IO

from sinkwright.errors import LinkLost

_REQUEST = struct.Struct("<IH")
_REPLY = struct.Struct("<QH")
_HEAD = _REPLY.size
_READ_BYTES = 1 << 16
MAX_BYTES = 0xFFFF
MAX_GRANT_US = 0xFFFF_FFFF

#: A child that takes longer than this over a grant hangs: the usual grant takes a millisecond.
PATIENCE_S = 30.0
#: How long a child may take over leaving once its input has ended.
_LEAVE_S = 2.0
_LAST_LINES = 12
#: Variables by which a person's own MicroPython set-up would reach into the child.
_FOREIGN = ("MICROPYPATH", "MICROPYINSPECT")


class Child:
    """A running child. `url` names it in errors."""

    def __init__(self, command: Sequence[str], first_line: bytes, url: str) -> None:
        self._url = url
        self._fate = "the simulated board was closed"
        # A file holds whatever the child complains about; a pipe that nobody reads would fill and stop it.
        self._complaints: IO[bytes] = tempfile.TemporaryFile()  # noqa: SIM115  closed with the child
        environment = {name: value for name, value in os.environ.items() if name not in _FOREIGN}
        self._process = subprocess.Popen(
            command,
            stdin=subprocess.PIPE,
            stdout=subprocess.PIPE,
            stderr=self._complaints,
            env=environment,
            bufsize=0,
            # Ctrl-C in a terminal reaches the whole foreground group; the board must live until the load is
            # off.
            start_new_session=True,
        )
        assert self._process.stdin is not None and self._process.stdout is not None  # both are PIPE
        self._to_child = self._process.stdin.fileno()
        self._from_child = self._process.stdout.fileno()
        self._received = b""
        self._readable = None
        if hasattr(select, "poll"):  # not on Windows, where a child that hangs is waited for
            self._readable = select.poll()
            self._readable.register(self._from_child, select.POLLIN)
        self._end = weakref.finalize(self, _end, self._process, self._complaints)
        self._write(first_line)

    def exchange(self, data: bytes, grant_us: int) -> tuple[bytes, int]:
        """Hand over `data` and let the child run for up to `grant_us`; its bytes, and its clock in
        microseconds.

        Raises LinkLost when the child has ended or hangs. An exception from a signal handler leaves the
        stream of answers whole: the next exchange reads on where this one stopped.
        """
        self.begin(data, grant_us)
        return self.finish()

    def begin(self, data: bytes, grant_us: int) -> None:
        """The first half of an exchange: the child runs on while its host does something else."""
        self._write(_REQUEST.pack(grant_us, len(data)) + data)

    def finish(self) -> tuple[bytes, int]:
        """The second half: wait for what the child says."""
        answer = self._received or self._read()
        while len(answer) < _HEAD or len(answer) < _HEAD + (count := _REPLY.unpack_from(answer)[1]):
            self._received = answer
            answer += self._read()
        time_us, count = _REPLY.unpack_from(answer)
        self._received = answer[_HEAD + count :]
        return answer[_HEAD : _HEAD + count], time_us

    def close(self) -> None:
        """End the child and wait for it. May be called twice."""
        self._let_go()

    def _write(self, data: bytes) -> None:
        try:
            written = os.write(self._to_child, data)
            while written < len(data):
                written += os.write(self._to_child, data[written:])
        except OSError:
            raise self._lost() from None

    def _read(self) -> bytes:
        if self._readable is not None and not self._readable.poll(PATIENCE_S * 1000):
            raise self._lost(f"the simulated board has not answered for {PATIENCE_S:.0f} s")
        try:
            data = os.read(self._from_child, _READ_BYTES)
        except OSError:
            data = b""
        if not data:
            raise self._lost()
        return data

    def _lost(self, what: str = "") -> LinkLost:
        """What is known about the end of the child, which is over with this."""
        if self._end.alive:
            code = _stop(self._process)
            ending = f"signal {-code}" if code < 0 else f"exit code {code}"
            self._fate = what or f"the simulated board has ended by itself ({ending})"
            if said := _last_lines(self._complaints):
                self._fate += f"; its last lines were:\n{said}\n"
            self._let_go()
        return LinkLost(
            self._fate,
            where=self._url,
            load="The simulated load is gone with it.",
            remedy="Start it again; if that repeats itself, please report it with the lines above.",
        )

    def _let_go(self) -> None:
        self._end()
        # The numbers may soon belong to other files.
        self._to_child = self._from_child = -1


def _stop(process: subprocess.Popen[bytes]) -> int:
    """End the process gently, else by force; its exit code."""
    if process.stdin is not None:
        with contextlib.suppress(OSError):
            process.stdin.close()
    try:
        return process.wait(_LEAVE_S)
    except subprocess.TimeoutExpired:
        process.kill()
        return process.wait()


def _end(process: subprocess.Popen[bytes], complaints: IO[bytes]) -> None:
    _stop(process)
    if process.stdout is not None:
        process.stdout.close()
    complaints.close()


def _last_lines(complaints: IO[bytes]) -> str:
    size = complaints.seek(0, os.SEEK_END)
    complaints.seek(max(0, size - 4096))
    lines = complaints.read().decode("utf-8", "replace").splitlines()
    return "\n".join(lines[-_LAST_LINES:])
