"""How long a report takes from one day at ten frames a second, and how large it is.

Asked for: 864,000 samples within 10 s and under 2 MB, with a spike of a single reading still in the curve.
Beside it, in the same run: what reading every sample into the program alone would take, which is what the
decimation within SQLite saves.
"""

from __future__ import annotations

import re
import sys
import tempfile
import time
from dataclasses import replace
from pathlib import Path

from sinkwright.records import RecordWriter, open_record
from sinkwright.reports import write_report
from tests.host.records.made_up import header, hold, regulation, samples

SAMPLES = 864_000
SPIKE_uV = 17_000_000
#: In SVG units, of about 280 in the figure's height.
STANDS_OUT = 20


def write_long_record(path: Path, count: int) -> float:
    """A record of `count` samples, one with a spike in a single reading; returns seconds a sample took to
    keep.
    """
    frames = list(samples([2.0] * count))
    spiked = count * 2 // 3
    frames[spiked] = replace(frames[spiked], voltage_max_uV=SPIKE_uV)
    writer = RecordWriter.create(path, header())
    started_s = time.perf_counter()
    for frame in frames:
        writer.add_samples([frame])
    spent_s = time.perf_counter() - started_s
    writer.add_result(regulation())
    writer.add_result(replace(hold(), ended_us=frames[-1].time_us))
    writer.finish("complete")
    return spent_s / count


def strokes(page: str, reading: str) -> list[tuple[float, float]]:
    """Top and bottom (SVG y) of each stroke of a curve's extremes."""
    path = re.search(rf'<g id="extremes-{reading}">\s*<path d="([^"]*)"', page)
    assert path, "no such curve"
    found = re.findall(r"M [-\d.]+ ([-\d.]+) \nL [-\d.]+ ([-\d.]+)", path[1])
    return [(min(float(a), float(b)), max(float(a), float(b))) for a, b in found]


def main(count: int = SAMPLES) -> None:
    with tempfile.TemporaryDirectory() as folder:
        record = Path(folder) / "long.sqlite"
        keep_s = write_long_record(record, count)
        start = time.perf_counter()
        report = write_report(record)
        report_s = time.perf_counter() - start
        tops = sorted(top for top, _ in strokes(report.read_text(encoding="utf-8"), "voltage"))
        start = time.perf_counter()
        with open_record(record) as opened:
            read = sum(1 for _ in opened.samples())
        read_s = time.perf_counter() - start
        size_MB = report.stat().st_size / 1e6
    spike = "stands out" if tops[1] - tops[0] > STANDS_OUT else "IS LOST"
    told = (
        f"{count} samples kept at {keep_s * 1e6:.1f} us each",
        f"report in {report_s:.1f} s (asked: 10), {size_MB:.2f} MB (asked: 2); a one-reading spike {spike}",
        f"alternative: only to read these {read} samples one by one takes {read_s:.1f} s",
    )
    for line in told:
        print(f"  {line}")


if __name__ == "__main__":
    main(*map(int, sys.argv[1:]))
