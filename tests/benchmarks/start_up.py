"""How long `sinkwright --help` takes, beside a bare interpreter that imports click. Pairs, so that drift cancels."""

from __future__ import annotations

import statistics
import subprocess
import sys
import time

PAIRS = 20
OURS = [sys.executable, "-m", "sinkwright", "--help"]
BARE = [sys.executable, "-c", "import click"]


def wall_s(command: list[str]) -> float:
    start = time.perf_counter()
    subprocess.run(command, stdout=subprocess.DEVNULL, check=True)
    return time.perf_counter() - start


def main() -> None:
    wall_s(OURS), wall_s(BARE)
    pairs = [(wall_s(OURS), wall_s(BARE)) for _ in range(PAIRS)]
    ours, bare = (statistics.median(column) * 1000 for column in zip(*pairs, strict=True))
    ratio = statistics.median(ours / bare for ours, bare in pairs)
    print(
        f"  sinkwright --help {ours:.0f} ms, import click {bare:.0f} ms: ratio {ratio:.2f} (median of {PAIRS} pairs)"
    )


if __name__ == "__main__":
    main()
