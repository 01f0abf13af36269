"""Every law against scipy.stats, which is written by others, or against its own definition."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
from scipy import integrate, special, stats

from pvfeas.errors import QuantityError
from pvfeas.laws import (
    Beta,
    Exact,
    Law,
    Lognormal,
    LogUniform,
    Normal,
    Truncated,
    TwoPiece,
    Uniform,
    bounded_beta,
    scaled,
    truncated,
)

PROBABILITIES = np.array([1e-12, 1e-6, 0.001, 0.05, 0.16, 0.5, 0.84, 0.95, 0.999, 1 - 1e-6])
BETA = Beta(0.95, 0.02, 0.0, 1.0)


def _beta(law: Beta) -> Any:
    """Shapes from mean and variance: a + b = m (1 - m)/v - 1 (any handbook of distributions)."""
    width = law.upper - law.lower
    mean, variance = (law.mean - law.lower) / width, (law.sd / width) ** 2
    size = mean * (1.0 - mean) / variance - 1.0
    return stats.beta(mean * size, (1.0 - mean) * size, loc=law.lower, scale=width)


CASES: list[tuple[Law, Any]] = [
    (Normal(60e3, 5e3), stats.norm(60e3, 5e3)),
    (Normal(-1.0, 2.0), stats.norm(-1.0, 2.0)),
    (Lognormal(2.0, 1.5), stats.lognorm(np.log(1.5), scale=2.0)),
    (Lognormal(0.05, 3.0), stats.lognorm(np.log(3.0), scale=0.05)),
    (Uniform(0.9, 1.0), stats.uniform(0.9, 0.1)),
    (Uniform(-3.0, 5.0), stats.uniform(-3.0, 8.0)),
    (LogUniform(0.01, 5.0), stats.loguniform(0.01, 5.0)),
    (BETA, _beta(BETA)),
    (Beta(0.3, 0.25, 0.0, 1.0), _beta(Beta(0.3, 0.25, 0.0, 1.0))),
    (Beta(5.0, 1.0, 2.0, 12.0), _beta(Beta(5.0, 1.0, 2.0, 12.0))),
    (Truncated(Normal(1.0, 0.6), 0.0, np.inf), stats.truncnorm(-1.0 / 0.6, np.inf, loc=1.0, scale=0.6)),
    (Truncated(Normal(0.5, 0.4), 0.0, 1.0), stats.truncnorm(-1.25, 1.25, loc=0.5, scale=0.4)),
]
IDS = [f"{type(law).__name__}-{i}" for i, (law, _) in enumerate(CASES)]


@pytest.mark.parametrize(("law", "oracle"), CASES, ids=IDS)
def test_quantiles(law: Law, oracle: Any) -> None:
    """1e-9: rounding of two routes; at a probability of 1 - 1e-6 that of the probability itself is 1e-10."""
    assert law.quantile(PROBABILITIES) == pytest.approx(oracle.ppf(PROBABILITIES), rel=1e-9)
    assert law.median == pytest.approx(oracle.median(), rel=1e-12)


@pytest.mark.parametrize(("law", "oracle"), CASES, ids=IDS)
def test_both_tails(law: Law, oracle: Any) -> None:
    """Each tail keeps its relative accuracy where it is small; those of a cut law are differences of its base's."""
    values, least = oracle.ppf(PROBABILITIES), 1e-15 if isinstance(law, Truncated) else 1e-300
    assert law.below(values) == pytest.approx(oracle.cdf(values), rel=1e-8, abs=least)
    assert law.above(values) == pytest.approx(oracle.sf(values), rel=1e-8, abs=least)


@pytest.mark.parametrize(("law", "oracle"), CASES, ids=IDS)
def test_scores_are_normal_scores(law: Law, oracle: Any) -> None:
    """The value at score z is the quantile at Phi(z); for beta from a table that promises 1e-10 of the range.
    1e-8: the oracle's own inversion of a cut law far out in its tail."""
    scores = np.linspace(-6.0, 6.0, 241)
    expected = np.where(scores < 0, oracle.ppf(special.ndtr(scores)), oracle.isf(special.ndtr(-scores)))
    range_ = float(np.ptp(oracle.ppf([1e-12, 1 - 1e-9])))
    assert law.from_score(scores) == pytest.approx(expected, rel=1e-8, abs=2e-10 * range_)


@pytest.mark.parametrize(("law", "oracle"), CASES, ids=IDS)
def test_nothing_lies_outside_the_support(law: Law, oracle: Any) -> None:
    low, high = oracle.support()
    assert (law.lower, law.upper) == pytest.approx((low, high))
    if np.isfinite(low):
        assert (float(law.below(low - 1.0)), float(law.above(low - 1.0))) == (0.0, 1.0)
    if np.isfinite(high):
        assert (float(law.below(high + 1.0)), float(law.above(high + 1.0))) == (1.0, 0.0)


def test_two_piece_normal_is_what_its_density_says() -> None:
    """Median 2.0, 16 and 84 % at 1.3 and 3.5; halves of two normal densities that meet at the median."""
    law = TwoPiece(2.0, 0.7, 1.5)
    edge = float(special.ndtr(1.0))  # 16 and 84 % are Phi(-1) and Phi(1)
    assert law.quantile([1.0 - edge, 0.5, edge]) == pytest.approx([1.3, 2.0, 3.5], rel=1e-12)

    def density(x: float) -> float:
        width = 0.7 if x < 2.0 else 1.5
        return float(stats.norm.pdf((x - 2.0) / width)) / width

    for end in (-1.0, 1.0, 2.0, 2.5, 5.0):
        below = integrate.quad(density, -8.0, min(end, 2.0), epsabs=1e-12)[0]
        below += integrate.quad(density, 2.0, end, epsabs=1e-12)[0] if end > 2.0 else 0.0
        assert float(law.below(end)) == pytest.approx(below, abs=1e-9)  # of the quadrature
        assert float(law.above(end)) == pytest.approx(1.0 - below, abs=1e-9)


def test_exact_is_a_step() -> None:
    law = Exact(3.0)
    assert (float(law.below(2.9)), float(law.above(2.9))) == (0.0, 1.0)
    assert (float(law.below(3.1)), float(law.above(3.1))) == (1.0, 0.0)
    assert float(law.from_score(4.0)) == law.median == 3.0


def test_cutting_tells_what_was_cut() -> None:
    law, below, above = truncated(Normal(1.0, 0.5), 0.0, np.inf)
    assert below == pytest.approx(0.022750131948179, rel=1e-12)  # Phi(-2), standard normal table
    assert above == 0.0
    assert isinstance(law, Truncated)
    assert truncated(Uniform(0.2, 0.4), 0.0, 1.0) == (Uniform(0.2, 0.4), 0.0, 0.0)


def test_bounded_beta_has_the_mean_and_spread_asked_for() -> None:
    law = bounded_beta(0.98, 0.01, 0.0, 1.0)
    assert _beta(law).mean() == pytest.approx(0.98, rel=1e-12)
    assert _beta(law).std() == pytest.approx(0.01, rel=1e-12)


@pytest.mark.parametrize(("mean", "sd"), [(1.0, 0.01), (0.0, 0.1), (0.5, 0.5), (0.98, 0.2)])
def test_a_beta_that_cannot_be(mean: float, sd: float) -> None:
    with pytest.raises(QuantityError):
        bounded_beta(mean, sd, 0.0, 1.0)


@pytest.mark.parametrize("law", [law for law, _ in CASES] + [Exact(2.0), TwoPiece(2.0, 0.7, 1.5)])
def test_a_change_of_unit_changes_the_values_only(law: Law) -> None:
    """1e-12: rounding."""
    changed = scaled(law, 1e3)
    assert changed.quantile(PROBABILITIES) == pytest.approx(1e3 * law.quantile(PROBABILITIES), rel=1e-12)
