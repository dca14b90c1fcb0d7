"""The USB serial port as `sys` and `select` show it on the RP2 port: it blocks when asked for more than there is.

Written from MicroPython's documentation of select.poll, sys.stdin and sys.stdout; the port's own behaviour (a read
waits until the whole buffer is full, a write waits up to 500 ms, POLLOUT promises one byte) was read in its source.
Here, what would wait raises WouldBlock.
"""


class WouldBlock(Exception):
    """The true port would have stood still here."""


class Incoming:
    def __init__(self):
        self.waiting = b""

    def readinto(self, buffer):
        if len(buffer) > len(self.waiting):
            raise WouldBlock("a read of more than is there")
        buffer[:] = self.waiting[: len(buffer)]
        self.waiting = self.waiting[len(buffer) :]
        return len(buffer)


class Outgoing:
    """`space` octets fit into the port's buffer; `sent` has left the board."""

    def __init__(self):
        self.space = 256
        self.sent = b""

    def write(self, data):
        if len(data) > self.space:
            raise WouldBlock("a write of more than fits")
        self.space -= len(data)
        self.sent += bytes(data)
        return len(data)


class Standard:
    """sys.stdin or sys.stdout: text, with the octets in `buffer`."""

    def __init__(self, buffer):
        self.buffer = buffer


class Sys:
    """What board.py uses of `sys`."""

    def __init__(self, implementation):
        self.implementation = implementation
        self.stdin = Standard(Incoming())
        self.stdout = Standard(Outgoing())
