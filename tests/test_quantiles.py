"""Quantiles of distributions that are known."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import special, stats

from pvfeas.conditional import NODES, NodePivot, NodeValues, excess
from pvfeas.laws import Array
from pvfeas.quantiles import of_values, pooled, solve
from pvfeas.roots import falling_root

WANTED = [0.05, 0.16, 0.5, 0.84, 0.95]


def lognormal(values: Array) -> Array:
    """ln x normal with mean 3 and width 1.2, in every one of 16 replicates."""
    return np.repeat(special.ndtr((np.log(values) - 3.0) / 1.2)[:, None], 16, axis=1)


@pytest.mark.parametrize("start", [1e-20, 1.0, 20.0, 1e30])
@pytest.mark.parametrize("spread", [0.0, 0.1, 1.2, 8.0])
def test_solves_from_any_start(start: float, spread: float) -> None:
    """1e-6: P is settled to 1e-9 and the least density is 0.09 per ln x."""
    found = solve(lognormal, WANTED, [start] * 5, spread)
    expected = np.exp(3.0 + 1.2 * special.ndtri(WANTED))
    assert [one.value for one in found] == pytest.approx(expected, rel=1e-6)
    assert [one.error for one in found] == pytest.approx([0.0] * 5)


def test_a_quantile_beyond_what_is_ever_reached_is_null() -> None:
    found = solve(lambda values: 0.6 * lognormal(values), WANTED, [20.0] * 5)
    assert [one.value is None for one in found] == [False, False, False, True, True]
    expected = np.exp(3.0 + 1.2 * special.ndtri(np.array([0.05, 0.16, 0.5]) / 0.6))
    assert [one.value for one in found[:3]] == pytest.approx(expected, rel=1e-6)


def test_a_quantile_within_the_error_of_what_is_reached_is_null() -> None:
    """P(reachable) = 0.5 ± 0.01 by the replicates: the median may or may not exist."""
    wobble = 0.02 * np.linspace(-1.0, 1.0, 16)
    found = solve(lambda values: lognormal(values) * (0.505 + wobble), [0.5, 0.16], [20.0, 20.0])
    assert found[0].value is None
    assert found[1].value is not None


def test_errors_are_those_of_the_replicates() -> None:
    """Replicates shifted in ln x by known amounts: the half-width is Student's of these shifts."""
    shifts = np.random.default_rng(2).normal(0.0, 0.01, 16)

    def shifted(values: Array) -> Array:
        return special.ndtr((np.log(values)[:, None] - 3.0 - shifts) / 1.2)

    found = solve(shifted, WANTED, [20.0] * 5)
    expected = 1.15 * stats.t.ppf(0.975, 15) * shifts.std(ddof=1) / 4.0
    for one in found:
        assert one.value is not None
        assert one.error is not None
        assert one.error / one.value == pytest.approx(expected, rel=0.02)  # the density is a difference quotient


def test_quantiles_of_draws() -> None:
    """Against NumPy's, mid-point rule (Hazen)."""
    values = np.random.default_rng(3).lognormal(0.0, 1.0, (1000, 16))
    weights = np.ones_like(values)
    expected = np.quantile(values.ravel(), WANTED, method="hazen")
    assert pooled(values, weights, WANTED) == pytest.approx(expected, rel=1e-12)  # rounding
    assert of_values(values, weights, WANTED)[0] == pytest.approx(expected, rel=1e-12)


def test_quantiles_of_draws_with_infinities_and_weights() -> None:
    values = np.array([1.0, 2.0, 3.0, np.inf, np.inf])
    assert pooled(values, np.ones(5), [0.3, 0.95]) == [2.0, np.inf]
    assert np.isinf(pooled(values, np.ones(5), [0.7])[0])
    assert pooled(np.array([1.0, 5.0]), np.array([99.0, 1.0]), [0.4]) == [1.0]


def margin_nodes(location: Array, slope: float) -> Array:
    """A lognormal quantity along the nodes: ln Q = location + slope z."""
    return np.exp(location + slope * NODES[:, None, None])


@pytest.mark.parametrize("slope", [0.05, -0.7, 2.0])
def test_a_lognormal_quantity_along_its_own_score(slope: float) -> None:
    """P(Q <= q) = Phi((ln q - location)/|slope|). 1e-10: linear in the score, the tails beyond 6.5 left out."""
    location = np.linspace(-1.0, 1.0, 7).reshape(1, 7)
    levels = np.exp(np.array([-1.5, 0.0, 0.8])).reshape(3, 1, 1, 1)
    found = NodeValues(margin_nodes(location, slope), -3).up_to(levels)
    expected = special.ndtr((np.log(levels[:, 0]) - location) / abs(slope))
    assert found == pytest.approx(expected, abs=1e-10)


def test_a_signal_between_two_levels_along_its_score() -> None:
    """A normal signal s = 1 + 0.5 z of either sign: the two outer intervals together. 1e-9: tails beyond the nodes."""
    signal = (1.0 + 0.5 * NODES).reshape(-1, 1, 1)
    least, infinite = np.full((1, 1, 1, 1), 0.3), np.array(np.inf)
    found = NodePivot(signal, -3).probability([(least, infinite), (-infinite, -least)])
    expected = special.ndtr((1.0 - 0.3) / 0.5) + special.ndtr((-0.3 - 1.0) / 0.5)
    assert found.reshape(()) == pytest.approx(expected, abs=1e-9)


def test_an_input_that_makes_no_difference() -> None:
    values = np.array([1.0, 2.0, np.inf]).reshape(1, 1, 3)
    assert NodeValues(values, -3).up_to(np.full((1, 1, 1, 1), 1.5)).reshape(3) == pytest.approx([1.0, 0.0, 0.0])


def test_excess_is_a_smooth_sign() -> None:
    assert float(excess(np.array(3.0), np.array(1.0))) == pytest.approx(np.tanh(0.5 * np.log(3.0)))
    assert float(excess(np.array(np.inf), np.array(1.0))) == 1.0
    assert float(excess(np.array(1.0), np.array(np.inf))) == -1.0
    assert float(excess(np.array(0.0), np.array(0.0))) == -1.0
    assert float(excess(np.array(np.inf), np.array(np.inf))) == -1.0


def test_falling_roots() -> None:
    """exp(-x) = c from one bracket for all. 1e-12: as asked."""
    level = np.exp(-np.linspace(-60.0, 130.0, 77))
    found = falling_root(lambda x: np.asarray(excess(np.exp(-x), level)), np.full(77, -80.0), np.full(77, 140.0))
    assert found == pytest.approx(-np.log(level), rel=1e-11, abs=1e-11)
