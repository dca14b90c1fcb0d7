"""Trouble that is not of the circuit: the host's, the interpreter's, the clock's. Runs on the board's side.

Each has `step(now)`, called every control period from the onset on, and `around(start)`, which runs the firmware.
`waits` counts writes that had to wait for the host; `struck_us` is when a trouble struck that waits for its chance
after the onset. It may put proxies in place of the board's parts before the firmware sees them.
"""

import sys

_READ_AGAIN_us = 200_000


class Trouble:
    waits = 0
    struck_us = None

    def __init__(self, bench, **_more):
        self.bench = bench
        self.done = False

    def step(self, now):
        if not self.done:
            self.done = True
            self.begin(now)

    def begin(self, now):
        pass

    def around(self, start):
        return start()


class HostKilled(Trouble):
    def begin(self, now):
        self.bench.host_silent = True


class Garbage(Trouble):
    """As many octets as a full-speed USB device can be sent in a period, and no host among them."""

    def begin(self, now):
        self.bench.host_silent = True
        count = 64 * 19 * self.bench.period_us // 1000  # at most 19 packets of 64 octets a millisecond
        self.bench.garbage = bytes([(k * k * 31 + k * 7 + (k >> 3)) & 0xFF for k in range(count)])

    def step(self, now):
        Trouble.step(self, now)
        # What the board has not read stays in the host's own buffers, however long it goes on sending.
        host = self.bench.board._host
        if len(host.incoming) > len(self.bench.garbage):
            host.incoming = b""


class Unread(Trouble):
    """The port stays open, nobody reads; a write that finds no room waits 500 ms, as the RP2 port does.

    At the end of the case somebody reads again, so that the host hears what happened.
    """

    def __init__(self, bench, **more):
        Trouble.__init__(self, bench, **more)
        stream = bench.board.stream
        bench.board.stream = self
        self._stream = stream
        self.read_into = stream.read_into
        self.room = stream.room

    def begin(self, now):
        self.bench.host_silent = True
        self.bench.unread = True

    def step(self, now):
        Trouble.step(self, now)
        if now > self.bench.case["end_us"] - _READ_AGAIN_us:
            self.bench.unread = False

    def write(self, data):
        taken = self._stream.write(data)
        if taken < len(data):
            self.bench.plant.now += 500_000
            self.waits += 1
        return taken


class Starved(Trouble):
    def __init__(self, bench, us, **more):
        Trouble.__init__(self, bench, **more)
        self._us = us

    def begin(self, now):
        self.bench.plant.now += self._us


class Hung(Trouble):
    """The firmware hangs within a step, with the gate released: the watchdog bites when its time is over."""

    def begin(self, now):
        plant = self.bench.plant
        host = self.bench.board._host
        plant.now = max(now, host.bites_at)
        plant.catch_up()
        host.bite()


class BusInterrupted(Trouble):
    """Ctrl-C arrives in the `call`th bus transaction after the onset."""

    def __init__(self, bench, call, **more):
        Trouble.__init__(self, bench, **more)
        self._bus = bench.board.bus
        self._left = call
        bench.board.bus = self

    def _count(self):
        if self.done:
            self._left -= 1
            if self._left == 0:
                self.struck_us = self.bench.plant.now
                raise KeyboardInterrupt

    def writeto(self, address, buffer):
        self._count()
        self._bus.writeto(address, buffer)

    def writeto_mem(self, address, register, buffer):
        self._count()
        self._bus.writeto_mem(address, register, buffer)

    def readfrom_into(self, address, buffer):
        self._count()
        self._bus.readfrom_into(address, buffer)

    def readfrom_mem_into(self, address, register, buffer):
        self._count()
        self._bus.readfrom_mem_into(address, register, buffer)


class Raising(Trouble):
    """From the onset on, one function of one module raises at every call."""

    def __init__(self, bench, module, function, owner=None, **more):
        Trouble.__init__(self, bench, **more)
        place = _module(module)
        self._place = getattr(place, owner) if owner else place
        self._name = function
        self._kept = getattr(self._place, function)
        self._raise = self._fail  # one object, to be found again
        if not bench.case["onset_us"]:
            self.step(0)

    def begin(self, now):
        self._replace(self._kept, self._raise)

    def _replace(self, before, after):
        """In the class or module, and wherever a module has imported the function by its name."""
        setattr(self._place, self._name, after)
        for module in sys.modules.values():
            if getattr(module, self._name, None) is before:
                setattr(module, self._name, after)

    def _fail(self, *arguments, **more):
        if self.struck_us is None:
            self.struck_us = self.bench.plant.now
        raise RuntimeError("brought about on purpose")

    def around(self, start):
        try:
            return start()
        finally:
            self._replace(self._raise, self._kept)


def _module(name):
    found = __import__(name)
    for part in name.split(".")[1:]:
        found = getattr(found, part)
    return found


_KINDS = {
    "": Trouble,
    "host_killed": HostKilled,
    "garbage": Garbage,
    "unread": Unread,
    "starved": Starved,
    "hung": Hung,
    "bus_interrupted": BusInterrupted,
    "raising": Raising,
}


def make(entry, bench):
    more = dict(entry)
    return _KINDS[more.pop("kind", "")](bench, **more)
