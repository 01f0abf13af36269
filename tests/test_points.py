"""The points: keyed by what an input is called and nothing else, and as accurate as a lattice should be."""

from __future__ import annotations

import numpy as np
import pytest

from pvfeas.generating_vector import GENERATING_VECTOR
from pvfeas.laws import Exact, Lognormal, Normal, Uniform
from pvfeas.points import REPLICATES, SAFETY, draw, half_width, shift, uniforms
from pvfeas.problem import Correlation, Ensemble, Input

INPUTS = [Input(f"x.{letter}", Normal(0.0, 1.0)) for letter in "abcd"]


def test_shift_depends_on_seed_address_and_replicate() -> None:
    seen = {shift(seed, address, r) for seed in (1, 2) for address in ("a", "b") for r in range(16)}
    assert len(seen) == 64
    assert all(0.0 <= one < 1.0 for one in seen)
    assert shift(1, "beam.line.fwhm", 3) == shift(1, "beam.line.fwhm", 3)


def test_a_lattice_visits_every_cell_once() -> None:
    """Before the map each replicate has one point in every interval of length 1/n; after it two in 2/n."""
    for dimension in (0, 3, 20):
        points = uniforms("x", dimension, 1, 8)
        counts = np.array([np.histogram(row, bins=128, range=(0.0, 1.0))[0] for row in points])
        assert np.all(counts == 2)


def test_components_are_odd_and_distinct() -> None:
    """Odd: prime to every power of two, so that all points of a lattice differ in every dimension."""
    assert all(one % 2 for one in GENERATING_VECTOR)
    assert len(set(GENERATING_VECTOR)) == len(GENERATING_VECTOR)


def test_other_inputs_change_nothing_but_the_place() -> None:
    """An input's place in the sorted list is its dimension; exact inputs take none."""
    few, more = (
        draw(INPUTS[:2], [], 1, 6),
        draw([*INPUTS[:2], Input("x.z", Uniform(0, 1)), Input("a", Exact(1.0))], [], 1, 6),
    )
    for one in ("x.a", "x.b"):
        assert np.array_equal(few.draws[one], more.draws[one])


def _mean_error(exponent: int) -> float:
    """Root mean square error of a smooth integral over four inputs, one lattice each: E exp(N(0, s^2)) = exp(s^2/2)."""
    sample = draw(INPUTS, [], 5, exponent)
    values = np.exp(sum(0.3 * sample.draws[one.address] for one in INPUTS))
    return float(np.sqrt(np.mean((values.mean(axis=-1) - np.exp(0.5 * 4 * 0.09)) ** 2)))


def test_far_better_than_plain_draws() -> None:
    """The integrand's standard deviation over sqrt n, exp(s^2/2) sqrt(exp(s^2) - 1)/sqrt n, is ten times worse."""
    plain = np.exp(0.18) * np.sqrt(np.exp(0.36) - 1.0) / np.sqrt(2.0**12)
    assert _mean_error(12) < plain / 10.0


def test_shifts_are_unbiased() -> None:
    """Mean over 16 seeds × 16 shifts within three of its own standard errors."""
    found = np.concatenate([np.exp(0.5 * draw(INPUTS, [], seed, 5).draws["x.b"]).mean(axis=-1) for seed in range(16)])
    assert abs(found.mean() - np.exp(0.125)) < 3.0 * found.std(ddof=1) / np.sqrt(found.size)


def test_correlated_scores_have_the_correlation() -> None:
    """2^14 points × 16: errors far below 0.002; the marginal laws stay."""
    ties = [Correlation(("x.a", "x.c"), 0.7), Correlation(("x.a", "x.d"), -0.4)]
    sample = draw(INPUTS, ties, 1, 14)
    flat = np.array([np.broadcast_to(sample.draws[one.address], sample.shape).ravel() for one in INPUTS])
    matrix = np.corrcoef(flat)
    expected = np.array([[1, 0, 0.7, -0.4], [0, 1, 0, 0], [0.7, 0, 1, 0], [-0.4, 0, 0, 1]])
    assert matrix == pytest.approx(expected, abs=0.002)
    assert flat.std(axis=1) == pytest.approx(np.ones(4), abs=0.002)


def test_ensembles_are_enumerated() -> None:
    one = Input("x.e", Ensemble(("p", "q"), (Exact(1.0), Lognormal(2.0, 1.5)), (0.25, 0.75), "method"))
    sample = draw([one, INPUTS[0]], [], 1, 10)
    assert sample.groups == ("method",)
    assert sample.weights == ((0.25, 0.75),)
    values = sample.draws["x.e"]
    assert values.shape[0] == 2
    assert np.all(values[0] == 1.0)
    # mean of the mixture: 0.25 + 0.75 × 2 exp(s^2/2), s = ln 1.5
    mixture = 0.25 + 0.75 * 2.0 * np.exp(np.log(1.5) ** 2 / 2.0)
    assert float(sample.average(values).mean()) == pytest.approx(mixture, rel=1e-3)  # 16 × 1024 points of a smooth mean


def test_half_width_covers_and_is_students() -> None:
    """Student's t with 15 degrees of freedom (table: 2.13145, hence 1e-5) times the stated safety."""
    random = np.random.default_rng(1)
    replicates = random.standard_normal((4000, REPLICATES))
    widths = half_width(replicates)
    assert widths[0] == pytest.approx(SAFETY * 2.13145 * replicates[0].std(ddof=1) / 4.0, rel=1e-5)
    covered = np.mean(np.abs(replicates.mean(axis=-1)) < widths)
    assert covered > 0.95
    assert half_width(np.ones((3, 1))) == pytest.approx(np.zeros(3))


def test_every_so_many_points_of_a_lattice_are_a_lattice() -> None:
    thin, small = draw(INPUTS, [], 1, 9).thinned(3), draw(INPUTS, [], 1, 6)
    for one in INPUTS:
        assert np.array_equal(thin.draws[one.address], small.draws[one.address])
    assert thin.shape == small.shape
