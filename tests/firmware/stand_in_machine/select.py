"""A stand-in for `select` over the port of streams.py, strict about what would wait or allocate.

Written from MicroPython's documentation: poll.poll and poll.ipoll wait for ever without a time-out, and poll
makes a new list at each call, which the idle loop must not.
"""

POLLIN = 1
POLLOUT = 4


class poll:  # noqa: N801 - the documented name
    def __init__(self):
        self._watched = None
        self._mask = 0

    def register(self, obj, eventmask=POLLIN | POLLOUT):
        if self._watched is not None:
            raise ValueError("one stream a poll object: its event would not tell which is meant")
        if eventmask not in (POLLIN, POLLOUT):
            raise ValueError("ask for what is meant: POLLIN or POLLOUT")
        self._watched = obj
        self._mask = eventmask

    def ipoll(self, timeout=-1):
        if timeout != 0:
            raise ValueError("any time-out but 0 waits")
        return self._events()

    def _events(self):
        port = self._watched.buffer
        if self._mask == POLLIN and port.waiting:
            yield self._watched, POLLIN
        if self._mask == POLLOUT and port.space:
            yield self._watched, POLLOUT
