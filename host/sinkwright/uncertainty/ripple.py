"""What a source's ripple leaves in a mean of samples: the error that sampling itself makes.

The converter averages over its own window w and is started every tau seconds. A harmonic k*f of amplitude A_k
then leaves at most (sum of a geometric series of N unit phasors)

    A_k * |sinc(k f w)| * min(1, 1 / (N |sin(pi k f tau)|)),    sinc(x) = sin(pi x) / (pi x)

in the mean of N samples. Where k*f*tau is whole, no time averages it out. The wave is taken as a sawtooth,
which is what a rectifier and its capacitor make: A_k = pp / (pi k). The harmonics' worst phases are added, so
this is a bound. Voltage and current are sampled one after the other: the firmware means two voltages around
each current, which cancels the skew to first order, and a constant current has no ripple to be multiplied
with.
"""

from __future__ import annotations

import math

#: Mains, and twice that behind a bridge.
MAINS_RIPPLE_HZ = (50.0, 60.0, 100.0, 120.0)
_HARMONICS = 40


def alias_bound(
    peak_to_peak: float, frequency_Hz: float, *, interval_s: float, window_s: float, samples: float
) -> float:
    """Largest error of the mean of `samples` samples, in the unit of `peak_to_peak`."""
    total = 0.0
    for k in range(1, _HARMONICS + 1):
        f = k * frequency_Hz
        turns = math.pi * f * window_s
        kept = abs(math.sin(turns) / turns)
        step = abs(math.sin(math.pi * f * interval_s)) * samples
        total += kept / k / max(1.0, step)
    return peak_to_peak / math.pi * total


def worst_mains_bound(peak_to_peak: float, *, interval_s: float, window_s: float, samples: float) -> float:
    """The same at whichever mains frequency leaves the most."""
    return max(
        alias_bound(peak_to_peak, f, interval_s=interval_s, window_s=window_s, samples=samples)
        for f in MAINS_RIPPLE_HZ
    )
