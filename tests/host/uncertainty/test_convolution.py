"""The half-width of a sum of errors against closed forms, a t table and a Monte Carlo propagation."""

from __future__ import annotations

import math
import time

import numpy as np
import pytest

from sinkwright.uncertainty.convolution import half_width, student_quantile

#: The promise of the module.
WITHIN = 0.002


def near(value: float) -> object:
    return pytest.approx(value, rel=WITHIN)


def test_one_rectangle_gives_ninety_five_hundredths_of_its_half_width() -> None:
    assert half_width((), (0.3,), ()) == near(0.95 * 0.3)


def test_two_equal_rectangles_give_a_triangle() -> None:
    """P(|x| > u) = (1 - u/2a)^2 for a triangle of half-width 2a."""
    assert half_width((), (1.0, 1.0), ()) == near(2 * (1 - math.sqrt(0.05)))


@pytest.mark.parametrize("small", [0.02, 0.045, 0.1, 0.3, 0.6, 0.9])
def test_two_unequal_rectangles_give_a_trapezoid(small: float) -> None:
    """Density 1/2 up to 1 - b, falling to nothing at 1 + b: the area beyond x is (1 + b - x)^2 / (8 b)."""
    top_ends_first = 0.5 * small / 2 < 0.025  # the tail of 2.5 % reaches below the slope
    expected = 0.95 if top_ends_first else 1 + small - math.sqrt(0.025 * 8 * small)
    assert half_width((), (1.0, small), ()) == near(expected)


def test_normals_add_in_quadrature() -> None:
    assert half_width((3.0, 4.0), (), ()) == pytest.approx(1.959964 * 5.0, rel=1e-6)


@pytest.mark.parametrize(
    ("dof", "table"),
    [(1, 12.706), (2, 4.303), (3, 3.182), (4, 2.776), (9, 2.262), (10, 2.228), (30, 2.042), (120, 1.980)],
)
def test_a_t_distribution_gives_its_table_value(dof: float, table: float) -> None:
    """Source: any table of Student's t, two-sided 95 % (also JCGM 100, table G.2)."""
    assert student_quantile(dof, 0.95) == pytest.approx(table, abs=6e-4)
    assert half_width((), (), ((0.7, dof),)) == near(0.7 * table)


def test_two_equal_cauchy_errors_add_linearly() -> None:
    """Student's t with one degree of freedom is Cauchy, whose widths add without a square root."""
    assert half_width((), (), ((1.0, 1.0), (1.0, 1.0))) == near(2 * 12.7062)


@pytest.mark.parametrize("coverage", [0.5, 0.6827, 0.9, 0.99])
def test_other_coverages_follow_the_same_distribution(coverage: float) -> None:
    assert half_width((), (1.0,), (), coverage) == pytest.approx(coverage, rel=0.003)
    assert half_width((), (1.0, 1.0), (), coverage) == near(2 * (1 - math.sqrt(1 - coverage)))


def test_a_coverage_that_is_none_is_refused() -> None:
    with pytest.raises(ValueError, match="outside"):
        half_width((1.0,), (), (), 95.0)


def test_nothing_uncertain_has_no_width() -> None:
    assert half_width((), (), ()) == 0.0


def test_many_rectangles_are_almost_normal() -> None:
    """Central limit: 30 of them have an excess kurtosis of -1.2/30, which hardly moves the quantile."""
    assert half_width((), (1.0,) * 30, ()) == pytest.approx(1.959964 * math.sqrt(10), rel=0.004)


BUDGETS = {
    "a rectangle and a normal": ((0.5,), (1.0,), ()),
    "rectangles of all sizes": ((0.05,), (1.0, 0.6, 0.2, 0.05, 0.01), ()),
    "a small t beside a rectangle": ((), (1.0,), ((0.05, 9.0),)),
    "a heavy t among the parts": ((0.1,), (0.5, 0.4), ((0.3, 3.0),)),
    "several t": ((), (0.3,), ((0.4, 5.0), (0.4, 9.0), (0.1, 20.0))),
    "a t of one degree of freedom, small": ((), (1.0,), ((0.01, 1.0),)),
}


@pytest.mark.parametrize("budget", BUDGETS.values(), ids=BUDGETS)
def test_the_half_width_agrees_with_a_monte_carlo_propagation(budget: tuple) -> None:
    """Source: JCGM 101, propagation of distributions by drawing; a million draws are good to about 0.2 %."""
    normals, rectangles, ts = budget
    draw = np.random.default_rng(20)
    total = np.zeros(1_000_000)
    for s in normals:
        total += draw.normal(0, s, total.size)
    for a in rectangles:
        total += draw.uniform(-a, a, total.size)
    for scale, dof in ts:
        total += scale * draw.standard_t(dof, total.size)
    by_drawing = float(np.quantile(np.abs(total), 0.95))
    assert half_width(normals, rectangles, ts) == pytest.approx(by_drawing, rel=2 * WITHIN)


def test_the_same_budget_gives_the_same_bits_in_any_order_and_unit() -> None:
    first = half_width((), (1.0, 0.5, 0.25), ((0.125, 9.0),))
    assert half_width((), (0.25, 1.0, 0.5), ((0.125, 9.0),)) == first
    assert half_width((), (256.0, 128.0, 64.0), ((32.0, 9.0),)) == 256.0 * first


def test_ten_causes_take_a_few_milliseconds() -> None:
    """The quickest of several that were not seen before, so that a busy machine does not count."""
    took_s = []
    for n in range(8):
        widths = tuple(1.0 / (k + 1) + 0.001 * n for k in range(7))
        start = time.perf_counter()
        half_width((0.1 + 0.001 * n,), widths, ((0.2, 9.0), (0.1, 9.0)))
        took_s.append(time.perf_counter() - start)
    assert min(took_s) < 0.003
