"""All figures that the project quotes, each measured beside its alternative in one run.

    python -m tests.benchmarks                 every benchmark
    python -m tests.benchmarks start_up ...    some of them

They print and never judge: a slow machine is not a wrong program. Run them on an otherwise idle machine.
"""

from __future__ import annotations

import importlib
import os
import platform
import sys
from pathlib import Path

#: In the order in which they are quickest to be told.
NAMES = (
    "start_up",
    "frames_decoded",
    "simulated_board",
    "time_budget",
    "recording_host",
    "report_from_many_samples",
)


def main(names: list[str]) -> int:
    unknown = sorted(set(names) - set(NAMES))
    if unknown:
        print(f"no benchmark is called {', '.join(unknown)}; there are {', '.join(NAMES)}", file=sys.stderr)
        return 2
    print(f"{platform.platform()}, CPython {platform.python_version()}, {os.cpu_count()} processors")
    for name in names or NAMES:
        print(f"\n{name}", flush=True)
        importlib.import_module(f"tests.benchmarks.{name}").main()
    return 0


if __name__ == "__main__":
    sys.path.insert(0, str(Path(__file__).resolve().parents[2]))
    sys.exit(main(sys.argv[1:]))
