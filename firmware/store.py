"""What the board remembers without power: two slots, written by turns, each with a sequence number and a check sum.

A change is written to the slot that is not in force, so a loss of power at any octet of the write leaves the
other one whole. A slot holds one table of names and values as JSON; this file knows what none of them means. It
never writes while the load is on: a write of flash memory stops everything else for longer than a control step.
Runs between control steps and may allocate.
"""

import binascii
import json
import struct

from micropython import const

import wire

# "SW", the layout's version, the sequence number and the length of the JSON text; the text; CRC-32 of all before.
_MAGIC = const(0x5753)
_LAYOUT = const(1)
_HEAD_FORMAT = "<HBIH"
_HEAD_BYTES = const(9)
_CRC_BYTES = const(4)
_SLOTS = const(2)
#: A slot's most octets: one flash block of the RP2's file system.
LARGEST_BYTES = const(4096)


class LoadIsOn(Exception):
    """The store is not written while the load sinks."""


class Store:
    """`medium` has `read(slot)`, giving octets (none for a slot never written), and `write(slot, octets)`."""

    def __init__(self, medium, machine):
        self._medium = medium
        self._machine = machine
        self._values = {}
        self._sequence = 0
        self._slot = _SLOTS - 1
        #: Whether slots were written once and none of them can be believed.
        self.spoiled = False
        self._load()

    def get(self, name, default=None):
        return self._values.get(name, default)

    def put(self, name, value):
        """Remember `value` (numbers, texts, lists and tables of such) under `name`, and write it at once.

        Raises LoadIsOn, ValueError when the store would grow beyond a slot, and OSError when the medium fails; the
        old value is then still the one in force.
        """
        if self._machine.state == wire.STATE_SINKING:
            raise LoadIsOn
        values = dict(self._values)
        values[name] = value
        slot = (self._slot + 1) % _SLOTS
        octets = _encode(self._sequence + 1, values)
        self._medium.write(slot, octets)
        if _decode(self._medium.read(slot)) is None:
            raise OSError("slot " + str(slot) + " does not hold what was written")
        self._values = values
        self._slot = slot
        self._sequence += 1

    def _load(self):
        written = 0
        for slot in range(_SLOTS):
            octets = self._medium.read(slot)
            written += len(octets) > 0
            found = _decode(octets)
            if found is not None and found[0] > self._sequence:
                self._sequence, self._values = found
                self._slot = slot
        # One slot alone may be the first write, cut off: then there was nothing to lose.
        self.spoiled = written == _SLOTS and not self._sequence


def _encode(sequence, values):
    text = json.dumps(values).encode()
    octets = struct.pack(_HEAD_FORMAT, _MAGIC, _LAYOUT, sequence, len(text)) + text
    if len(octets) + _CRC_BYTES > LARGEST_BYTES:
        raise ValueError("the store holds no more than " + str(LARGEST_BYTES) + " octets")
    return octets + struct.pack("<I", binascii.crc32(octets))


def _decode(octets):
    """(sequence, values) of a whole slot, else None. What follows the check sum is an older, longer write's."""
    if len(octets) < _HEAD_BYTES:
        return None
    magic, layout, sequence, length = struct.unpack(_HEAD_FORMAT, octets[:_HEAD_BYTES])
    end = _HEAD_BYTES + length
    if magic != _MAGIC or layout != _LAYOUT or len(octets) < end + _CRC_BYTES:
        return None
    if binascii.crc32(octets[:end]) != struct.unpack("<I", octets[end : end + _CRC_BYTES])[0]:
        return None
    return sequence, json.loads(octets[_HEAD_BYTES:end])
