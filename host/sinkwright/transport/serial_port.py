"""A board on a serial port, through pyserial: what may go wrong when it is opened, read, written and
unplugged.

It must not know what travels. The traps it steps around were measured: `read(1024)` waits its whole time-out
even with bytes there; unplugging shows as SerialException, bare OSError or termios.error, depending on the
call.
"""

from __future__ import annotations

import contextlib
import errno
import sys

import serial

from sinkwright.errors import LOAD_UNTOUCHED, LinkLost, SinkwrightError
from sinkwright.transport.reader_thread import READ_TIMEOUT_S, WRITE_TIMEOUT_S, ThreadedChannel, WallClock

if sys.platform == "win32":
    _GONE: tuple[type[BaseException], ...] = (OSError,)
else:
    import termios

    _GONE = (OSError, termios.error)

#: A USB CDC port ignores it; a board behind a UART adapter needs one agreed rate.
BAUD_RATE = 115200

_BUSY = {errno.EBUSY, errno.EAGAIN, errno.EWOULDBLOCK}


class SerialPort(WallClock):
    """An opened pyserial port for the reader thread."""

    failures = _GONE

    def __init__(self, port: serial.Serial) -> None:
        self._port = port

    def read(self) -> bytes:
        port = self._port
        data = port.read(max(1, port.in_waiting))
        # The first byte of a frame ends the wait alone; its rest is fetched now, to wake the event loop only
        # once.
        waiting = port.in_waiting if data else 0
        return data + port.read(waiting) if waiting else data

    def write(self, data: bytes) -> None:
        self._port.write(data)

    def close(self) -> None:
        self._port.close()


def open_serial(url: str) -> ThreadedChannel:
    """Open a device path or pyserial URL for this program alone. Raises LinkLost, saying why not."""
    try:
        port = serial.serial_for_url(
            url,
            baudrate=BAUD_RATE,
            timeout=READ_TIMEOUT_S,
            write_timeout=WRITE_TIMEOUT_S,
            exclusive=True,
        )
    except ValueError as error:
        raise SinkwrightError(
            f"this is no port ({error})",
            where=f"port {url!r}",
            load=LOAD_UNTOUCHED,
            remedy="Give a device path, tcp:HOST:PORT, board:NAME or sim:; see `sinkwright ports`.",
        ) from None
    except OSError as error:
        raise _not_opened(url, error) from error
    with contextlib.suppress(*_GONE):
        port.reset_input_buffer()
    return ThreadedChannel(url, SerialPort(port))


def _not_opened(url: str, error: OSError) -> LinkLost:
    number, text = error.errno, str(error)
    # On Windows pyserial gives only the text of the system's error, and a held port is "access denied".
    if number in _BUSY or (sys.platform == "win32" and "PermissionError" in text):
        what = "another program holds this port"
        remedy = "Close that program, or look for a second Sinkwright that still runs."
    elif number == errno.EACCES:
        what = "you may not open this port"
        remedy = "On Linux add yourself to the group that owns it (often dialout), then log in again."
    elif number == errno.ENOENT or "FileNotFoundError" in text:
        what = "there is no such port"
        remedy = "Check cable and board, and list what is there with `sinkwright ports`."
    else:
        what = f"this port cannot be opened ({text})"
        remedy = "List what is there with `sinkwright ports`."
    return LinkLost(what, where=url, load=LOAD_UNTOUCHED, remedy=remedy)
