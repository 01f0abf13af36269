"""Thresholds, trials and looks against published values, other quadratures and simulation."""

from __future__ import annotations

import json
import time
from pathlib import Path

import mpmath
import numpy as np
import pytest
from scipy import special

from pvfeas import thresholds
from pvfeas.laws import Array

CHECKS = {
    check["id"]: check
    for check in json.loads((Path(__file__).parent / "data" / "checks.json").read_text(encoding="utf-8"))
}


def test_one_sided_p_values() -> None:
    check = CHECKS["det.p1"]  # standard normal
    for k, expected in zip(check["inputs"]["k"], check["expected"], strict=True):
        assert thresholds.p_value(k, 1) == pytest.approx(expected, rel=check["tolerance"]["rel"])
        assert thresholds.p_value(k, 2) == pytest.approx(2 * expected, rel=check["tolerance"]["rel"])


def test_confidence_of_one_to_five_sigma() -> None:
    inside = [0.6826894921, 0.9544997361, 0.9973002039, 0.9999366575, 0.9999994267]  # standard tables, ten digits
    for k, expected in enumerate(inside, start=1):
        assert 1.0 - thresholds.p_value(k, 2) == pytest.approx(expected, abs=5.1e-11)


@pytest.mark.parametrize("sides", [1, 2])
@pytest.mark.parametrize("k", [0.3, 1.0, 3.0, 5.0, 8.0, 37.0])
def test_threshold_undoes_p_value(k: float, sides: int) -> None:
    assert thresholds.threshold_for(thresholds.p_value(k, sides), sides) == pytest.approx(k, rel=1e-12)


@pytest.mark.parametrize("k", [-3.0, 0.0, 2.0, 10.0, 37.0, 80.0, 1e4])
def test_sigma_of_a_tail_below_the_smallest_float(k: float) -> None:
    with mpmath.workdps(40):
        tail = float(mpmath.log(mpmath.erfc(mpmath.mpf(k) / mpmath.sqrt(2)) / 2))
    assert thresholds.sigma_of_log_tail(tail) == pytest.approx(k, rel=1e-12, abs=1e-12)


@pytest.mark.parametrize("trials", [1, 2, 30, 10**6])
@pytest.mark.parametrize("p", [0.3, 1e-3, 5.7e-7, 1e-30])
def test_trials_without_cancellation(p: float, trials: int) -> None:
    with mpmath.workdps(60):
        exact = float(1 - (1 - mpmath.mpf(p)) ** (mpmath.mpf(1) / trials))
    assert thresholds.local_p(p, trials) == pytest.approx(exact, rel=1e-13)


@pytest.mark.parametrize("sides", [1, 2])
def test_trials_keep_the_false_claim_rate(sides: int) -> None:
    """Twelve lines, none with a splitting: some claim at the raised threshold as often as at 1.5 sigma on one line."""
    k, trials, campaigns = 1.5, 12, 400_000
    raised = thresholds.effective_threshold(k, sides, trials=trials)
    outcomes = np.random.default_rng(1).standard_normal((campaigns, trials))
    largest = (np.abs(outcomes) if sides == 2 else outcomes).max(axis=1)
    p = thresholds.p_value(k, sides)
    assert np.mean(largest > raised) == pytest.approx(p, abs=4 * np.sqrt(p * (1 - p) / campaigns))


@pytest.mark.parametrize(
    ("significance", "looks", "expected"),
    [(5, 5, 5.283), (5, 12, 5.406), (5, 60, 5.572), (3, 5, 3.384), (3, 12, 3.536), (3, 60, 3.738)],
)
def test_boundaries_of_the_decision_rules(significance: float, looks: int, expected: float) -> None:
    """Three decimals as the decision rules state them; 5.5715 was rounded up there, hence a whole last digit."""
    assert thresholds.constant_boundary(float(significance), 2, looks) == pytest.approx(expected, abs=6e-4)


@pytest.mark.parametrize(("looks", "expected"), [(2, 2.178), (3, 2.289), (4, 2.361), (5, 2.413), (10, 2.555)])
def test_constant_boundary_at_five_percent(looks: int, expected: float) -> None:
    """Pocock 1977, Biometrika 64, 191, Table 1 (from memory): overall two-sided 5 %."""
    assert thresholds.constant_boundary(-float(special.ndtri(0.025)), 2, looks) == pytest.approx(expected, abs=6e-4)


@pytest.mark.parametrize(
    ("looks", "expected"), [(1, 0.05), (2, 0.083), (5, 0.142), (10, 0.193), (20, 0.248), (50, 0.320)]
)
def test_repeated_tests_at_five_percent(looks: int, expected: float) -> None:
    """Armitage, McPherson & Rowe 1969, Table 2 (from memory): chance of a false claim at 1.96 sigma."""
    assert thresholds.crossing(-float(special.ndtri(0.025)), 2, looks) == pytest.approx(expected, abs=6e-4)


@pytest.mark.parametrize("boundary", [0.7, 3.0, 5.3])
def test_two_looks_are_one_integral(boundary: float) -> None:
    """p = 2 Phi(-c) + integral of the first step's density times the chance that the second one crosses."""

    def tail(x: mpmath.mpf) -> mpmath.mpf:
        return mpmath.erfc(x / mpmath.sqrt(2)) / 2

    c = mpmath.mpf(boundary)
    edge = c * mpmath.sqrt(2)
    for sides in (1, 2):
        low = -c if sides == 2 else -mpmath.mpf(12)

        def leaves(x: mpmath.mpf, sides: int = sides) -> mpmath.mpf:
            return mpmath.npdf(x) * (tail(edge - x) + (tail(edge + x) if sides == 2 else 0))

        exact = float(sides * tail(c) + mpmath.quad(leaves, mpmath.linspace(low, c, 9)))
        # one-sided: paths that begin below -6.5 are left out, 4e-11 of all
        assert thresholds.crossing(boundary, sides, 2) == pytest.approx(exact, rel=1e-9)


def simpson_crossing(boundary: float, sides: int, looks: int, nodes: int = 801) -> float:
    """The same probability by Simpson's rule on even spacings of the sum over sqrt(look), nothing left out."""
    low = -boundary if sides == 2 else -9.0
    unit = np.linspace(low, boundary, nodes)
    weights = np.full(nodes, 2.0)
    weights[1::2], weights[[0, -1]] = 4.0, 1.0
    weights = weights * (unit[1] - unit[0]) / 3.0
    density, total = np.exp(-0.5 * unit**2) / np.sqrt(2 * np.pi), sides * special.ndtr(-boundary)
    for look in range(2, looks + 1):
        before, now = unit * np.sqrt(look - 1), unit * np.sqrt(look)
        mass = weights * np.sqrt(look - 1) * density
        total += (mass * special.ndtr(before - now[-1])).sum()
        if sides == 2:
            total += (mass * special.ndtr(now[0] - before)).sum()
        kernel = np.exp(-0.5 * (now[:, None] - before[None, :]) ** 2) / np.sqrt(2 * np.pi)
        density = (kernel * mass[None, :]).sum(axis=1)
    return float(total)


@pytest.mark.parametrize(("significance", "sides", "looks"), [(5.0, 2, 5), (5.0, 1, 12), (3.0, 2, 25), (5.0, 2, 40)])
def test_boundary_by_another_quadrature(significance: float, sides: int, looks: int) -> None:
    boundary = thresholds.constant_boundary(significance, sides, looks)
    kept = simpson_crossing(boundary, sides, looks)
    # 1e-6 in the boundary is a relative 5e-6 of p at 5 sigma
    assert thresholds.threshold_for(kept, sides) == pytest.approx(significance, abs=1e-6)


@pytest.mark.parametrize("sides", [1, 2])
@pytest.mark.parametrize("looks", [5, 30])
def test_looks_keep_the_false_claim_rate(sides: int, looks: int) -> None:
    """Campaigns without splitting, claimed as soon as the running mean is beyond the boundary."""
    k, campaigns = 1.3, 200_000
    boundary = thresholds.effective_threshold(k, sides, looks=looks)
    sums = np.zeros(campaigns)
    claimed = np.zeros(campaigns, dtype=bool)
    generator = np.random.default_rng(looks + sides)
    for look in range(1, looks + 1):
        sums += generator.standard_normal(campaigns)
        claimed |= (np.abs(sums) if sides == 2 else sums) > boundary * np.sqrt(look)
    p = thresholds.p_value(k, sides)
    assert claimed.mean() == pytest.approx(p, abs=4 * np.sqrt(p * (1 - p) / campaigns))


def test_one_look_and_one_trial_change_nothing() -> None:
    assert thresholds.effective_threshold(4.2, 2, 1, 1) == 4.2
    assert thresholds.constant_boundary(4.2, 2, 1) == pytest.approx(4.2, abs=1e-11)


def test_looks_come_on_top_of_trials() -> None:
    raised = thresholds.effective_threshold(3.0, 2, trials=20)
    assert thresholds.effective_threshold(3.0, 2, 20, 6) == thresholds.constant_boundary(raised, 2, 6)


@pytest.mark.parametrize("sides", [1, 2])
def test_boundary_rises_with_looks_and_stays_below_independent_ones(sides: int) -> None:
    looks = [1, 2, 3, 8, 20, 100]
    for significance in (0.05, 1.0, 5.0, 9.9, 10.1, 25.0, 60.0):
        found = np.array([thresholds.constant_boundary(significance, sides, n) for n in looks])
        independent = thresholds.sigma_of_log_tail(special.log_ndtr(-significance) - np.log(looks))
        assert np.all(np.diff(found) > 0)
        assert np.all(found <= independent + 1e-11)


def test_trials_far_beyond_the_smallest_float() -> None:
    k = thresholds.effective_threshold(50.0, 2, trials=1000)
    assert special.log_ndtr(-k) == pytest.approx(special.log_ndtr(-50.0) - np.log(1000), rel=1e-13)


def test_boundary_is_quick_and_remembered() -> None:
    thresholds.constant_boundary.cache_clear()
    start = time.perf_counter()
    for looks in (5, 12, 60):
        thresholds.constant_boundary(5.0, 2, looks)
    first = time.perf_counter() - start
    assert first < 0.6  # three boundaries at under 0.2 s each
    start = time.perf_counter()
    thresholds.constant_boundary(5.0, 2, 60)
    assert time.perf_counter() - start < 1e-3


def test_values_are_plain_numbers() -> None:
    found: list[float | Array] = [thresholds.effective_threshold(5.0, 2, 3, 3), thresholds.p_value(5.0, 2)]
    assert all(type(value) is float for value in found)
