"""Loses the power at every octet of a store's write, in every way a medium can leave it, and starts anew each time.

Prints JSON: how many octets the write has, how many cuts were tried, and the cuts after which neither the old nor the
new value was there, or nothing could be stored any more.
"""

import json

import store
import wire

_OLD = {"current": {"zero_counts": 800, "whole": 200, "part": 11}, "number": 1}
_NEW = {"current": {"zero_counts": 803, "whole": 199, "part": 16000}, "number": 2, "by": "a longer one"}


class PowerCut(Exception):
    pass


class Medium:
    """Slots whose next write stops after `cut` octets; `leaves(data, old, cut)` is what then stands there."""

    def __init__(self, slots):
        self.slots = list(slots)
        self.cut = None
        self.leaves = None

    def read(self, slot):
        return self.slots[slot]

    def write(self, slot, data):
        if self.cut is None:
            self.slots[slot] = bytes(data)
            return
        self.slots[slot] = self.leaves(bytes(data), self.slots[slot], self.cut)
        self.length = len(data)
        raise PowerCut


def _file(data, _old, cut):
    return data[:cut]


def _in_place(data, old, cut):
    return data[:cut] + old[cut:]


def _torn_octet(data, old, cut):
    """The octet under way is neither the old nor the new one."""
    if cut == len(data):
        return data
    return data[:cut] + bytes([data[cut] ^ 0x5A]) + old[cut + 1 :]


class _Off:
    state = wire.STATE_OFF


def _before(writes):
    medium = Medium([b"", b""])
    kept = store.Store(medium, _Off())
    for _ in range(writes):
        kept.put("calibration", _OLD)
    return medium


def _survives(before, leaves, cut):
    """(whether a value is there after the cut and a new one can be stored, how long the write was)"""
    medium = Medium(before.slots)
    kept = store.Store(medium, _Off())
    medium.cut, medium.leaves = cut, leaves
    try:
        kept.put("calibration", _NEW)
    except PowerCut:
        medium.cut = None
    after = store.Store(medium, _Off())
    good = not after.spoiled and after.get("calibration") in (kept.get("calibration"), _NEW)
    after.put("calibration", _NEW)
    return good and store.Store(medium, _Off()).get("calibration") == _NEW, medium.length


def main():
    tried = longest = 0
    lost = []
    for writes in (0, 1, 2, 3):
        before = _before(writes)
        for leaves in (_file, _in_place, _torn_octet):
            cut, length = 0, 1
            while cut <= length:
                good, length = _survives(before, leaves, cut)
                tried += 1
                longest = max(longest, length)
                if not good:
                    lost.append([writes, leaves.__name__, cut])
                cut += 1
    print(json.dumps({"octets": longest, "cuts": tried, "lost": lost}))
