"""Limit constructions against published tables, brute force on grids and simulated outcomes."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from scipy import special

from pvfeas import limits
from pvfeas.errors import UsageError
from pvfeas.laws import Array

CHECKS = {
    check["id"]: check
    for check in json.loads((Path(__file__).parent / "data" / "checks.json").read_text(encoding="utf-8"))
}
FC_CHECKS = [check for name, check in CHECKS.items() if name.startswith("fc.")]
LEVELS = (0.6827, 0.90, 0.95, 0.99)
# Feldman & Cousins 1998, Phys. Rev. D 57, 3873, Table X, as recomputed on a grid of likelihood ratios
# (good to 3e-4 there); rows -3, 0 and 1 agree with the printed ones from memory.
TABLE_X: dict[float, tuple[tuple[float, float], ...]] = {
    -3.0: ((0, 0.0379), (0, 0.2635), (0, 0.4228), (0, 0.7980)),
    -2.0: ((0, 0.0691), (0, 0.4016), (0, 0.6180), (0, 1.0971)),
    -1.0: ((0, 0.2724), (0, 0.8136), (0, 1.1021), (0, 1.6844)),
    0.0: ((0, 1.0000), (0, 1.6449), (0, 1.9600), (0, 2.5758)),
    0.5: ((0.0247, 1.5000), (0, 2.1449), (0, 2.4600), (0, 3.0758)),
    1.0: ((0.2405, 2.0000), (0, 2.6449), (0, 2.9600), (0, 3.5758)),
    1.5: ((0.5614, 2.5000), (0.2181, 3.1449), (0, 3.4600), (0, 4.0758)),
    2.0: ((1.0000, 3.0000), (0.5823, 3.6449), (0.3548, 3.9600), (0, 4.5758)),
    2.5: ((1.5000, 3.5000), (0.9454, 4.1449), (0.7611, 4.4600), (0.1737, 5.0758)),
    3.0: ((2.0000, 4.0000), (1.3678, 4.6449), (1.1407, 4.9600), (0.6734, 5.5758)),
}


@pytest.mark.parametrize("check", FC_CHECKS, ids=lambda check: check["id"])
def test_feldman_cousins_checks(check: dict[str, Any]) -> None:
    for level, ends in zip(check["inputs"]["CL"], check["expected"], strict=True):
        found = limits.feldman_cousins_interval(check["inputs"]["x0_over_sigma"], level)
        assert np.array(found) == pytest.approx(np.array(ends), abs=check["tolerance"]["abs"])


def test_feldman_cousins_table() -> None:
    outcomes = np.array(list(TABLE_X))
    for place, level in enumerate(LEVELS):
        lower, upper = limits.feldman_cousins_interval(outcomes, level)
        expected = np.array([row[place] for row in TABLE_X.values()])
        assert np.stack([lower, upper], axis=1) == pytest.approx(expected, abs=1.1e-4)  # four decimals


def accepted_on_a_grid(y: Array, likelihood: Array, best: Array, level: float) -> Array:
    """Cells of y in the acceptance region: by falling likelihood ratio until the probability is reached."""
    step = y[1] - y[0]
    order = np.argsort(-likelihood / best)
    count = np.searchsorted(np.cumsum(likelihood[order]) * step, level) + 1
    inside = np.zeros(len(y), dtype=bool)
    inside[order[:count]] = True
    return inside


@pytest.mark.parametrize(("x", "level"), [(-2.3, 0.95), (-0.7, 0.8), (-0.05, 0.99), (0.4, 0.9)])
def test_bounded_limit_by_brute_force(x: float, level: float) -> None:
    y = np.arange(-12.0, 12.0, 0.001) + 0.0005
    best = np.exp(-0.5 * np.minimum(y, 0.0) ** 2) / np.sqrt(2 * np.pi)
    found = float(limits.feldman_cousins_bounded(x, level))
    cell = int(np.searchsorted(y, x))
    for mean, inside in ((found - 0.004, True), (found + 0.004, False)):  # the grid's own doubt is 0.002
        likelihood = np.exp(-0.5 * (y - mean) ** 2) / np.sqrt(2 * np.pi)
        assert accepted_on_a_grid(y, likelihood, best, level)[cell] == inside


def folded(y: Array, mean: Array | float) -> Array:
    return np.asarray((np.exp(-0.5 * (y - mean) ** 2) + np.exp(-0.5 * (y + mean) ** 2)) / np.sqrt(2 * np.pi))


def test_limit_on_size_by_brute_force() -> None:
    y = np.arange(0.0, 14.0, 0.001) + 0.0005
    best = np.max([folded(y, mean) for mean in np.arange(0.0, 14.0, 0.01)], axis=0)
    for x, level in ((0.114, 0.9), (0.0, 0.95), (0.6, 0.72), (1.0, 0.95), (1.5, 0.8), (2.5, 0.99)):
        found = float(limits.feldman_cousins_abs(x, level))
        cell = int(np.searchsorted(y, x))
        for mean, inside in ((found - 0.006, True), (found + 0.006, False)):
            assert accepted_on_a_grid(y, folded(y, mean), best, level)[cell] == inside, (x, level)


def test_limit_on_size_is_refused_where_its_intervals_are_empty() -> None:
    with pytest.raises(UsageError, match=r"needs 0\.7 or more"):
        limits.feldman_cousins_abs(0.3, 0.65)


@pytest.mark.parametrize("level", [0.7, 0.9, 0.95, 0.999])
def test_tables_follow_the_root_finding(level: float) -> None:
    """The interpolants are good to the 1e-6 that they promise, between their nodes too."""
    x = np.linspace(0.0, 9.0, 3337)
    assert limits.flat_prior_abs(x, level) == pytest.approx(limits.flat_prior_limit(x, level), abs=1e-6)
    on_size = limits.feldman_cousins_abs_limit(x, level)
    assert limits.feldman_cousins_abs(x, level) == pytest.approx(on_size, abs=1e-6)
    signed = np.linspace(-11.0, 3.0, 3337)
    exact = limits.feldman_cousins_interval(signed, level)[1]
    assert limits.feldman_cousins_bounded(signed, level) == pytest.approx(exact, abs=1e-6)
    assert limits.lowest_accepted(exact[signed < 0], level) == pytest.approx(signed[signed < 0], abs=1e-5)


def test_expected_limits() -> None:
    check = CHECKS["limit.expected"]
    one_sided, cls, unified = np.array(check["expected"]).reshape(3, 2)
    for place, level in enumerate((0.90, 0.95)):
        tolerance = check["tolerance"]["rel"]
        assert limits.one_sided_z(level) == pytest.approx(one_sided[place], rel=tolerance)
        assert limits.planned_limit("cls", level, 0.5) == pytest.approx(cls[place], rel=tolerance)
        assert limits.planned_limit("feldman-cousins-bounded", level, 0.5) == pytest.approx(
            unified[place], rel=tolerance
        )


def test_planned_limits_with_sign_unknown() -> None:
    """Median and 90 % of |x| + z sigma without splitting, at 90 and 95 % confidence."""
    found = [limits.planned_limit("abs-plus-z", level, power) for power in (0.5, 0.9) for level in (0.90, 0.95)]
    assert found == pytest.approx([2.319, 2.634, 3.290, 3.605], abs=5.1e-4)


def test_cls_plan_and_bands() -> None:
    assert limits.planned_limit("cls", 0.95, 0.9) == pytest.approx(2.977, abs=5.1e-4)
    # Cowan et al. 2011, Eur. Phys. J. C 71, 1554: bands of the 95 % limit at -2 ... +2 sigma
    found = limits.cls(np.array([-2.0, -1.0, 0.0, 1.0, 2.0]), 0.95)
    assert found == pytest.approx([1.0518, 1.4120, 1.9600, 2.7272, 3.6560], abs=5.1e-5)


def test_cls_is_the_ratio_of_tails() -> None:
    x = np.linspace(-30.0, 8.0, 77)
    limit = limits.cls(x, 0.95)
    assert special.log_ndtr(x - limit) - special.log_ndtr(x) == pytest.approx(np.full(77, np.log(0.05)), rel=1e-9)


def test_electron_electric_dipole_example() -> None:
    """Cairncross et al. 2017, Phys. Rev. Lett. 119, 153001: (0.9 ± 7.7 ± 1.7)e-29 prints as 1.3e-28 at 90 %."""
    sigma = np.hypot(7.7, 1.7)
    x = 0.9 / sigma
    assert sigma * limits.limit("flat-prior-abs", x, 0.9) == pytest.approx(13.05, abs=0.0051)
    assert sigma * limits.limit("feldman-cousins-abs", x, 0.9) == pytest.approx(11.7, abs=0.051)
    assert sigma * limits.limit("abs-plus-z", x, 0.9) == pytest.approx(13.87, abs=0.0051)


def test_flat_prior_by_direct_integration() -> None:
    d = np.arange(-20.0, 20.0, 1e-3)
    for x, level in ((0.0, 0.9), (0.7, 0.95), (2.2, 0.8)):
        posterior = np.exp(-0.5 * (d - x) ** 2) / np.sqrt(2 * np.pi)
        limit = float(limits.flat_prior_abs(x, level))
        # rectangles with ragged ends: the density at the ends times a spacing
        assert posterior[np.abs(d) < limit].sum() * 1e-3 == pytest.approx(level, abs=5e-4)


@pytest.mark.parametrize("construction", limits.CONSTRUCTIONS)
def test_chance_of_a_limit_by_simulated_outcomes(construction: str) -> None:
    outcomes = np.random.default_rng(7).standard_normal(100_000)
    stated = limits.limit(construction, outcomes, 0.95)
    for size in (1.2, 1.9, 2.4, 3.1, 4.0):
        p = float(limits.chance_of_limit(construction, size, 0.95))
        bound = 4 * np.sqrt(max(p * (1 - p), 1e-5) / len(outcomes))
        assert np.mean(stated < size) == pytest.approx(p, abs=bound)


@pytest.mark.parametrize("construction", limits.CONSTRUCTIONS)
@pytest.mark.parametrize("power", [0.3, 0.5, 0.9, 0.99])
def test_planned_limit_is_met_with_its_power(construction: str, power: float) -> None:
    planned = limits.planned_limit(construction, 0.9, power)
    # the tables that turn outcomes into limits and back are good to 1e-6 each; slopes are below 10
    assert limits.chance_of_limit(construction, planned, 0.9) == pytest.approx(power, abs=1e-5)


@pytest.mark.parametrize("construction", ["abs-plus-z", "feldman-cousins-abs", "feldman-cousins-bounded", "cls"])
@pytest.mark.parametrize("truth", [0.0, 0.4, 1.5, 4.0])
def test_limits_cover(construction: str, truth: float) -> None:
    """The truth lies above the limit in at most 1 - confidence of all outcomes."""
    outcomes = truth + np.random.default_rng(11).standard_normal(100_000)
    missed = np.mean(limits.limit(construction, outcomes, 0.9) < truth)
    assert missed <= 0.1 + 4 * np.sqrt(0.09 / len(outcomes))


def test_unified_interval_covers_exactly() -> None:
    for truth in (0.3, 1.0, 3.0):
        outcomes = truth + np.random.default_rng(13).standard_normal(40_000)
        lower, upper = limits.feldman_cousins_interval(outcomes, 0.9)
        assert np.mean((lower <= truth) & (truth <= upper)) == pytest.approx(0.9, abs=4 * np.sqrt(0.09 / 40_000))


@pytest.mark.parametrize("construction", limits.CONSTRUCTIONS)
def test_limits_rise_with_the_outcome_and_keep_shape(construction: str) -> None:
    outcomes = np.linspace(0.0, 20.0, 400).reshape(20, 1, 20)
    found = limits.limit(construction, outcomes, 0.95)
    assert found.shape == (20, 1, 20)
    assert np.all(np.diff(found.reshape(-1)) > 0)
    far = limits.one_sided_z(0.95) if construction in ("flat-prior-abs", "cls") else limits.two_sided_z(0.95)
    assert found[-1, 0, -1] == pytest.approx(20.0 + float(far), rel=1e-12)


@pytest.mark.parametrize("construction", limits.CONSTRUCTIONS)
def test_chances_at_the_ends(construction: str) -> None:
    found = limits.chance_of_limit(construction, np.array([0.0, 1e-9, 60.0, np.inf]), 0.95)
    assert found == pytest.approx([0.0, 0.0, 1.0, 1.0], abs=1e-12)
