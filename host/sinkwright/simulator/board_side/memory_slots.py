"""The simulated board's flash memory: two slots that outlast a restart, and with a file this process too."""

import json
import os


class Store:
    """Two slots. With a memory (see memory.py of the simulator) they outlast this process, like flash memory: a
    file is written beside, then renamed, so that whoever is killed in between leaves the old one.
    """

    def __init__(self, memory):
        self._memory = memory or {}
        self._slots = [bytes.fromhex(slot) for slot in self._memory.get("slots") or ("", "")]

    def read(self, slot):
        return self._slots[slot]

    def write(self, slot, data):
        self._slots[slot] = bytes(data)
        if "path" in self._memory:
            self._keep()

    def _keep(self):
        path = self._memory["path"]
        kept = {name: self._memory[name] for name in ("format", "seed", "starts")}
        kept["slots"] = [slot.hex() for slot in self._slots]
        with open(path + ".new", "w") as file:
            file.write(json.dumps(kept) + "\n")
        # Where a file in place is not replaced by `rename`, Python has a name for it that does.
        getattr(os, "replace", os.rename)(path + ".new", path)
