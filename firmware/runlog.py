"""The run log: the whole of a run in a fixed amount of memory, for a host that comes back later.

An entry every `spacing_ms`; when the log is full, neighbours are merged and the spacing doubles, so that a
run of any length is covered from its beginning. Everything is preallocated. Merging goes on in bounded slices
between control steps, while the meter's own window keeps gathering.
"""

from array import array

from micropython import const

_FIRST_SPACING_ms = const(1_000)
_MERGES_PER_SLICE = const(64)
_LOWEST_cC = const(-32768)
_HIGHEST_cC = const(32767)


#: How many entries the board's log has.
LARGEST = const(4000)


def _columns(capacity):
    # From octets: a list of as many zeros would need another contiguous piece of the heap for each of them.
    blank = bytes(4 * capacity)
    quads = [array("i", blank) for _ in range(4)]
    return quads + [array("I", blank), array("I", blank), array("h", bytes(2 * capacity))]


# More than half of a small microcontroller's heap: made while that is still in one piece, because main.py imports
# this file before nearly all others.
_LARGEST_COLUMNS = _columns(LARGEST)


class RunLog:
    def __init__(self, meter, timekeeper, capacity):
        self._meter = meter
        self._time = timekeeper
        self.capacity = capacity
        columns = _LARGEST_COLUMNS if capacity == LARGEST else _columns(capacity)
        self.voltage_uV, self.voltage_min_uV, self.voltage_max_uV, self.current_uA = columns[:4]
        self.time_ms, self.charge_mC, self.heatsink_cC = columns[4:]
        self.running = False
        self._reset()

    def _reset(self):
        self.entries = 0
        self.spacing_ms = _FIRST_SPACING_ms
        self._merged = 0
        self._merging = False

    def begin(self):
        """A run begins: the log of the one before is given up."""
        self._reset()
        self._started_s = self._time.seconds
        self._started_ms = self._time.micros // 1000
        self._due_ms = self.spacing_ms
        self._meter.log.restart()
        self.running = True

    def elapsed_ms(self):
        return (self._time.seconds - self._started_s) * 1000 + self._time.micros // 1000 - self._started_ms

    def service(self, sinking):
        """Every few control steps: append when due, merge a slice when full, close when the load is off."""
        if self._merging:
            self._merge_slice()
        elif self.running and not sinking:
            self.running = False
            self._append()
        elif self.running and self.elapsed_ms() >= self._due_ms:
            self._append()
            self._due_ms += self.spacing_ms

    def _append(self):
        """What the meter's window has gathered becomes an entry."""
        window = self._meter.log
        if not window.pairs:
            return
        at = self.entries
        self.time_ms[at] = self.elapsed_ms()
        self.voltage_uV[at] = window.voltage_uV()
        self.voltage_min_uV[at] = window.voltage_min_uV
        self.voltage_max_uV[at] = window.voltage_max_uV
        self.current_uA[at] = window.current_uA()
        self.heatsink_cC[at] = min(max(self._meter.heatsink_mC // 10, _LOWEST_cC), _HIGHEST_cC)
        self.charge_mC[at] = max(self._meter.charge_uC() // 1000, 0)
        self.entries = at + 1
        window.restart()
        if self.entries == self.capacity:
            self._merging = True
            self._merged = 0

    def _merge_slice(self):
        for _ in range(_MERGES_PER_SLICE):
            if 2 * self._merged + 1 >= self.entries:
                self._finish_merging()
                return
            self._merge(self._merged)
            self._merged += 1

    def _merge(self, at):
        first = 2 * at
        second = first + 1
        self.time_ms[at] = self.time_ms[second]
        self.voltage_uV[at] = (self.voltage_uV[first] + self.voltage_uV[second]) >> 1
        self.voltage_min_uV[at] = min(self.voltage_min_uV[first], self.voltage_min_uV[second])
        self.voltage_max_uV[at] = max(self.voltage_max_uV[first], self.voltage_max_uV[second])
        self.current_uA[at] = (self.current_uA[first] + self.current_uA[second]) >> 1
        self.heatsink_cC[at] = max(self.heatsink_cC[first], self.heatsink_cC[second])
        self.charge_mC[at] = self.charge_mC[second]

    def _finish_merging(self):
        self.entries = self._merged
        self.spacing_ms *= 2
        self._due_ms = self.time_ms[self.entries - 1] + self.spacing_ms
        self._merging = False
