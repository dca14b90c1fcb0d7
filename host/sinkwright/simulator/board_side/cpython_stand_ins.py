"""The MicroPython names that the firmware and this folder use, for where CPython runs them.

Only names are supplied, no behaviour: `const` hands back what it gets, and collecting is CPython's own
affair. What MicroPython checks by itself (small integers, no allocation) is not checked here.
"""

import gc
import sys
import types


def install():
    micropython = types.ModuleType("micropython")
    micropython.const = _same
    sys.modules["micropython"] = micropython
    collector = types.ModuleType("gc")
    collector.collect = gc.collect
    collector.threshold = collector.mem_free = collector.mem_alloc = _nothing
    sys.modules["gc"] = collector


def _same(value):
    return value


def _nothing(*_arguments):
    return 0
