"""Draws the curves of a report as SVG: the same record gives the same bytes, and no reading is hidden.

Every bin of an envelope becomes a vertical stretch from its lowest to its highest reading, so a single
reading out of a million still shows. It knows envelopes and points, no records.
"""

from __future__ import annotations

import io
import math
import re
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from itertools import pairwise
from typing import Any

from sinkwright.records.envelope import Bin

BINS = 1200
_VOLTAGE, _CURRENT, _HEATSINK, _JUNCTION = "#1f5f8b", "#a8501a", "#54702b", "#8c3a5e"
_PAIR = ("#1f5f8b", "#a8501a")
_WIDTH_in = 7.2
#: A pause longer than this many typical spacings of the bins is drawn as a gap.
_GAP_SPACINGS = 3.0

_STYLE: Any = {
    "svg.hashsalt": "sinkwright",
    # Text stays text: it can be searched and read aloud, and needs no embedded shapes.
    "svg.fonttype": "none",
    # Simplifying paths drops points, which is how a spike would be lost.
    "path.simplify": False,
    "font.family": "sans-serif",
    "font.size": 9,
    "axes.spines.top": False,
    "axes.spines.right": False,
    "axes.formatter.useoffset": False,
    "axes.grid": True,
    "grid.color": "#d9d9d9",
    "grid.linewidth": 0.6,
    "axes.edgecolor": "#444444",
    "text.parse_math": False,
}


@dataclass(frozen=True)
class Span:
    """A stretch of the time axis with its label: one test. Times on the board's clock, microseconds."""

    label: str
    first_us: int
    last_us: int


@dataclass(frozen=True)
class Coarse:
    """The stretch that only the board kept, one entry every `spacing_us`."""

    first_us: int
    last_us: int
    spacing_us: int


@dataclass(frozen=True)
class Trace:
    """One curve of points; `label` empty leaves the legend out."""

    label: str
    points: Sequence[Mapping[str, float]]


def voltage_and_current(bins: Sequence[Bin], spans: Sequence[Span], coarse: Sequence[Coarse] = ()) -> str:
    """Voltage above current over time, one time axis."""
    with _styled():
        figure = _figure(3.9)
        above, below = figure.subplots(2, 1, sharex=True)
        unit = _time_unit(bins)
        _band(above, bins, unit, "voltage", "V", _VOLTAGE, coarse=coarse)
        _band(below, bins, unit, "current", "A", _CURRENT, coarse=coarse)
        above.set_ylabel("Voltage / V")
        below.set_ylabel("Current / A")
        above.margins(x=0.01)
        _time_axis(below, unit)
        _mark(above, spans, bins, unit, labelled=True)
        _mark(below, spans, bins, unit, labelled=False)
        for stretch in coarse:
            _mark_coarse(above, bins, unit, stretch)
        return _svg(figure, "Voltage and current over time")


def temperatures(bins: Sequence[Bin], spans: Sequence[Span], coarse: Sequence[Coarse] = ()) -> str:
    """Heatsink, and the junction as estimated, over time."""
    with _styled():
        figure = _figure(2.3)
        axes = figure.subplots()
        unit = _time_unit(bins)
        _band(
            axes, bins, unit, "junction", "degC", _JUNCTION, "transistor junction (estimated)", "--", coarse
        )
        _band(axes, bins, unit, "heatsink", "degC", _HEATSINK, "heatsink", coarse=coarse)
        axes.set_ylabel("Temperature / °C")
        axes.legend(frameon=False, loc="best", fontsize=8)
        _time_axis(axes, unit)
        _mark(axes, spans, bins, unit, labelled=True)
        return _svg(figure, "Temperatures over time")


def characteristic(traces: Sequence[Trace], title: str) -> str:
    """Voltage over current: the points that a test measured."""
    with _styled():
        figure = _figure(2.7)
        axes = figure.subplots()
        for trace, color, marker, line in zip(traces, _PAIR, "os", ("-", "--"), strict=False):
            current = [point["current_A"] for point in trace.points]
            voltage = [point["voltage_V"] for point in trace.points]
            axes.plot(
                current, voltage, line, marker=marker, markersize=4, lw=1, color=color, label=trace.label
            )
        axes.set_xlabel("Current / A")
        axes.set_ylabel("Voltage / V")
        if any(trace.label for trace in traces):
            axes.legend(frameon=False, loc="best", fontsize=8)
        return _svg(figure, title)


def voltage_over_charge(runs: Sequence[tuple[str, Sequence[Bin]]]) -> str:
    """The voltage of two runs over the charge drawn, which compares even where the currents differ."""
    with _styled():
        figure = _figure(3.0)
        axes = figure.subplots()
        for (label, bins), color, line in zip(runs, _PAIR, ("-", "--"), strict=False):
            charge_Ah = [b.charge_C / 3600 for b in bins]
            axes.plot(charge_Ah, [b.voltage_V for b in bins], line, lw=1, color=color, label=label)
        axes.set_xlabel("Charge drawn / Ah")
        axes.set_ylabel("Voltage / V")
        axes.legend(frameon=False, loc="best", fontsize=8)
        return _svg(figure, "Voltage over the charge drawn, both runs")


def _band(
    axes: Any, bins: Sequence[Bin], unit: tuple[float, str], reading: str, si: str, color: str,
    label: str = "", line: str = "-", coarse: Sequence[Coarse] = (),
) -> None:  # fmt: skip
    """The mean as a line, and each bin's lowest to highest reading as a vertical stroke in its middle."""
    start_us, scale = bins[0].first_us, unit[0] * 1e6
    times = [((b.first_us + b.last_us) / 2 - start_us) / scale for b in bins]
    low = [getattr(b, f"{reading}_min_{si}") for b in bins]
    high = [getattr(b, f"{reading}_max_{si}") for b in bins]
    # One broken line instead of a thousand strokes: a quarter of the bytes.
    across = [x for time in times for x in (time, time, math.nan)]
    along = [y for ends in zip(low, high, strict=True) for y in (*ends, math.nan)]
    axes.plot(across, along, lw=0.7, color=color, alpha=0.55, gid=f"extremes-{reading}")
    for part in stretches(bins, max((stretch.spacing_us for stretch in coarse), default=0)):
        mean = [getattr(b, f"{reading}_{si}") for b in bins[part]]
        axes.plot(times[part], mean, line, lw=1.1, color=color, label=label)
        label = ""


def stretches(bins: Sequence[Bin], spacing_us: int = 0) -> list[slice]:
    """The bins cut where no sample came for unusually long, and longer than `spacing_us` explains."""
    spacing = sorted(later.first_us - earlier.first_us for earlier, later in pairwise(bins))
    usual = max(spacing[len(spacing) // 2] if spacing else 0, spacing_us)
    pauses = [later.first_us - earlier.last_us for earlier, later in pairwise(bins)]
    cuts = [place for place, pause in enumerate(pauses, start=1) if pause > _GAP_SPACINGS * usual]
    return [slice(first, last) for first, last in pairwise([0, *cuts, len(bins)])]


def _time_unit(bins: Sequence[Bin]) -> tuple[float, str]:
    length_s = (bins[-1].last_us - bins[0].first_us) / 1e6
    if length_s > 3 * 3600:
        return 3600.0, "h"
    return (60.0, "min") if length_s > 300 else (1.0, "s")


def _time_axis(axes: Any, unit: tuple[float, str]) -> None:
    axes.set_xlabel(f"Time since the first reading / {unit[1]}")
    axes.margins(x=0.01)


def _mark(
    axes: Any, spans: Sequence[Span], bins: Sequence[Bin], unit: tuple[float, str], labelled: bool
) -> None:
    """Shade every other test, and name each above the curves; only where there are readings to it."""
    start_us, end_us, scale = bins[0].first_us, bins[-1].last_us, unit[0] * 1e6
    for number, span in enumerate(spans):
        first_us, last_us = max(span.first_us, start_us), min(span.last_us, end_us)
        if first_us > last_us:
            continue
        first, last = (first_us - start_us) / scale, (last_us - start_us) / scale
        if number % 2 == 0:
            axes.axvspan(first, last, color="#f0efe9", zorder=0, lw=0)
        if labelled:
            place = {"transform": axes.get_xaxis_transform(), "ha": "center", "va": "bottom"}
            axes.text((first + last) / 2, 1.02, span.label, fontsize=8, color="#444444", **place)


def _mark_coarse(axes: Any, bins: Sequence[Bin], unit: tuple[float, str], coarse: Coarse) -> None:
    """Hatch the stretch that only the board kept, and say so at its foot."""
    start_us, scale = bins[0].first_us, unit[0] * 1e6
    first, last = (coarse.first_us - start_us) / scale, (coarse.last_us - start_us) / scale
    axes.axvspan(first, last, facecolor="none", edgecolor="#d0cec4", hatch="//", zorder=0, lw=0)
    words = f"kept by the board, every {coarse.spacing_us / 1e6:g} s"
    place = {"transform": axes.get_xaxis_transform(), "ha": "center", "va": "bottom"}
    axes.text((first + last) / 2, 0.02, words, fontsize=8, color="#444444", **place)


def _styled() -> Any:
    import matplotlib

    return matplotlib.rc_context(_STYLE)


def _figure(height_in: float) -> Any:
    from matplotlib.figure import Figure

    return Figure(figsize=(_WIDTH_in, height_in), layout="constrained")


def _svg(figure: Any, title: str) -> str:
    """The figure as an element to stand within HTML: no prolog, no ids that nothing refers to, and a name."""
    buffer = io.StringIO()
    figure.savefig(
        buffer, format="svg", metadata={"Date": None, "Creator": None, "Format": None, "Type": None}
    )
    text = buffer.getvalue()
    text = text[text.index("<svg") :]
    used = set(re.findall(r'(?:url\(|href=")#([^")]+)', text))
    text = re.sub(
        r' id="([^"]*)"',
        lambda found: found[0] if found[1] in used or found[1].startswith("extremes-") else "",
        text,
    )
    text = re.sub(r"<metadata>.*?</metadata>", "", text, flags=re.DOTALL)
    return text.replace("<svg ", f'<svg role="img" aria-label="{title}" ', 1)
