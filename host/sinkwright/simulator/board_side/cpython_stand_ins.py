"""The MicroPython names that the firmware and this folder use, for where CPython runs them.

Only names are supplied, hardly any behaviour: `const` hands back what it gets, and collecting is CPython's own
affair. What MicroPython checks by itself (small integers, no allocation) is not checked here.
"""

import gc
import sys
import traceback
import types


def install():
    micropython = types.ModuleType("micropython")
    micropython.const = _same
    sys.modules["micropython"] = micropython
    collector = types.ModuleType("gc")
    collector.collect = gc.collect
    collector.threshold = collector.mem_free = collector.mem_alloc = _nothing
    sys.modules["gc"] = collector
    sys.print_exception = _print_exception


def _same(value):
    return value


def _print_exception(error, file):
    for line in traceback.format_exception(error):
        file.write(line.encode())


def _nothing(*_arguments):
    return 0
