"""The 95 % half-width of a sum of independent errors: their distributions convolved, not a fixed k.

A factor k = 2 covers 95 % only where the sum is close to normal; where one rectangle dominates, it covers
all. JCGM 101 asks for the distribution of the sum itself. For a linear sum it is the convolution of its
terms, so its characteristic function is the product of theirs, and the distribution function follows by
inversion (Gil-Pelaez, Biometrika 38, 1951; from memory), for errors symmetric about zero:

    F(x) = 1/2 + 1/pi * integral from 0 to infinity of sin(t x) / t * product of phi_i(t) dt

    normal        phi(t) = exp(-(s t)^2 / 2)
    rectangular   phi(t) = sin(a t) / (a t); a triangle is the sum of two equal rectangles of half its width
    t             a normal whose variance is itself unknown: the mean of exp(-(s t)^2 / (2 w)) over w, where
                  w * dof is chi-square distributed with dof degrees of freedom

Gauss-Legendre panels, narrow enough for the quickest oscillation, do the integral. Nothing here is drawn at
random, so the same errors always give the same half-width. It must not know what the errors are errors of.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from functools import lru_cache
from statistics import NormalDist

#: Nodes and weights of 8-point Gauss-Legendre quadrature on -1..1, the positive half (Abramowitz and Stegun
#: 25.4).
_GAUSS = (
    (0.1834346424956498, 0.3626837833783620),
    (0.5255324099163290, 0.3137066458778873),
    (0.7966664774136267, 0.2223810344533745),
    (0.9602898564975363, 0.1012285362903763),
)
#: An error smaller than this share of the half-width is as good as normal: its shape is lost in the sum.
_SMALL = 0.04
#: The normal part is at least this share of the half-width, so that the integral ends. It rounds corners of
#: the distribution and makes the half-width larger by less than 0.05 %.
_ROUNDING = 0.012
#: Where the characteristic function has fallen below this, the rest of the integral changes nothing.
_NEGLIGIBLE = 1e-6
#: From this many degrees of freedom on, t has the shape of a normal with the same quantile, within 0.1 %.
_MANY_DOF = 100.0


def half_width(
    normals: tuple[float, ...],
    rectangles: tuple[float, ...],
    ts: tuple[tuple[float, float], ...],
    coverage: float = 0.95,
) -> float:
    """The x with P(|sum| <= x) = coverage, within 0.2 %.

    `normals` are standard deviations, `rectangles` half-widths, `ts` pairs of scale and degrees of freedom;
    all positive and in one unit, which is also the result's. Raises ValueError for a coverage outside
    0.5..0.999.
    """
    if not 0.5 <= coverage <= 0.99:
        raise ValueError(f"a coverage of {coverage:g} is outside 0.5 to 0.99")
    largest = max((*normals, *rectangles, *(scale for scale, _ in ts)), default=0.0)
    if largest == 0.0:
        return 0.0
    # In units of the largest and in one order, so that equal budgets are remembered whatever their unit.
    return largest * _half_width(
        math.sqrt(sum((s / largest) ** 2 for s in normals)),
        tuple(sorted(a / largest for a in rectangles)),
        tuple(sorted((scale / largest, dof) for scale, dof in ts)),
        coverage,
    )


@lru_cache(maxsize=512)
def _half_width(
    normal: float, rectangles: tuple[float, ...], ts: tuple[tuple[float, float], ...], coverage: float
) -> float:
    z = NormalDist().inv_cdf((1 + coverage) / 2)
    bound = _bound(normal, rectangles, ts, coverage, z)
    # Closer to the edge of a distribution, smaller things matter.
    fineness = min(1.0, (1 - coverage) / 0.05)
    small = _SMALL * bound * fineness
    variance = normal**2
    shaped_rectangles = [a for a in rectangles if a >= small]
    variance += sum(a**2 / 3 for a in rectangles if a < small)
    shaped_ts = []
    for scale, dof in ts:
        quantile = student_quantile(dof, coverage)
        if dof > _MANY_DOF or quantile * scale < small:
            variance += (scale * quantile / z) ** 2
        else:
            shaped_ts.append((scale, dof))
    if not shaped_rectangles and not shaped_ts:
        return z * math.sqrt(variance)
    variance = max(variance, (_ROUNDING * bound * fineness) ** 2)
    terms = _integrand(variance, shaped_rectangles, shaped_ts, bound)
    return _root(lambda x: 0.5 * coverage - _inside(terms, x), bound)


def _bound(
    normal: float,
    rectangles: tuple[float, ...],
    ts: tuple[tuple[float, float], ...],
    coverage: float,
    z: float,
) -> float:
    """Somewhat more than the half-width: t parts added as if they were fully correlated."""
    return z * math.sqrt(normal**2 + sum(a**2 for a in rectangles) / 3) + sum(
        student_quantile(dof, coverage) * scale for scale, dof in ts
    )


def _integrand(
    variance: float, rectangles: list[float], ts: list[tuple[float, float]], bound: float
) -> list[tuple[float, float]]:
    """Pairs of t and weight * phi(t) / (pi t): all of the integral but its sine."""
    mixtures = [(scale, _variances(dof)) for scale, dof in ts]

    def phi(t: float) -> float:
        product = math.exp(-variance * t * t / 2)
        for a in rectangles:
            product *= math.sin(a * t) / (a * t)
        if abs(product) < _NEGLIGIBLE / 10:
            return product
        for scale, mixture in mixtures:
            half = (scale * t) ** 2 / 2
            product *= sum(weight * math.exp(-half * inverse) for weight, inverse in mixture)
        return product

    # Eight nodes integrate one and a half turns of the quickest oscillation to within 1e-6.
    panel = 3 * math.pi / (bound + sum(rectangles) + math.sqrt(variance))
    terms: list[tuple[float, float]] = []
    start = 0.0
    quiet = 0
    while quiet < 3:
        middle, half = start + panel / 2, panel / 2
        loudest = 0.0
        for node, weight in _GAUSS:
            for t in (middle - half * node, middle + half * node):
                value = phi(t)
                loudest = max(loudest, abs(value))
                terms.append((t, half * weight * value / (math.pi * t)))
        # The zeros of one rectangle can hide the rest for a panel, not for three.
        quiet = quiet + 1 if loudest < _NEGLIGIBLE else 0
        start += panel
    return terms


def _inside(terms: list[tuple[float, float]], x: float) -> float:
    """P(0 <= sum <= x)."""
    sin = math.sin
    return sum(weight * sin(t * x) for t, weight in terms)


def _root(falling: Callable[[float], float], bound: float) -> float:
    """Where `falling` crosses zero, by false position with the Illinois step (common practice)."""
    low, high = 0.0, bound
    at_low, at_high = falling(low), falling(high)
    while at_high > 0:
        high *= 1.2
        at_high = falling(high)
    while True:
        middle = (low * at_high - high * at_low) / (at_high - at_low)
        at_middle = falling(middle)
        if abs(at_middle) < 1e-6 or high - low < 1e-6 * bound:
            return middle
        if at_middle > 0:
            low, at_low = middle, at_middle
            at_high /= 2
        else:
            high, at_high = middle, at_middle
            at_low /= 2


@lru_cache(maxsize=128)
def _variances(dof: float) -> tuple[tuple[float, float], ...]:
    """The variances that a t distribution mixes: pairs of weight and 1/w, evenly spaced in ln w.

    The density of y = ln w is proportional to exp(dof/2 * (y - exp(y))); the trapezoidal rule converges
    quickly.
    """
    # A step of a little over the peak's own deviation; for a small dof the right flank is the narrower.
    step = min(0.5, 1.2 * math.sqrt(2 / dof))
    weights: list[tuple[float, float]] = []
    for direction in (-1, 1):
        y = 0.0 if direction < 0 else step
        while (density := math.exp(dof / 2 * (y - math.exp(y) + 1))) > 1e-6:
            weights.append((density, math.exp(-y)))
            y += direction * step
    total = sum(density for density, _ in weights)
    return tuple((density / total, inverse) for density, inverse in weights)


@lru_cache(maxsize=512)
def student_quantile(dof: float, coverage: float) -> float:
    """The t with P(|T| <= t) = coverage, for dof >= 1: the value of a common t table."""
    z = NormalDist().inv_cdf((1 + coverage) / 2)
    if math.isinf(dof):
        return z
    low, high = z, z
    while _student_inside(high, dof) < coverage:
        high *= 2
    while high - low > 1e-9 * high:
        middle = (low + high) / 2
        low, high = (middle, high) if _student_inside(middle, dof) < coverage else (low, middle)
    return (low + high) / 2


def _student_inside(t: float, dof: float) -> float:
    """P(|T| <= t): the density integrated over the angle atan(t / sqrt(dof)), where it is cos**(dof - 1)."""
    angle = math.atan(t / math.sqrt(dof))
    panels = 4 + int(angle * math.sqrt(dof))
    half = angle / panels / 2
    total = 0.0
    for number in range(panels):
        middle = half * (2 * number + 1)
        for node, weight in _GAUSS:
            total += weight * (
                math.cos(middle - half * node) ** (dof - 1) + math.cos(middle + half * node) ** (dof - 1)
            )
    scale = math.exp(math.lgamma((dof + 1) / 2) - math.lgamma(dof / 2)) / math.sqrt(math.pi)
    return 2 * scale * half * total
