"""Systematics: sizes, averaging, and what not knowing them costs."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import mpmath
import numpy as np
import pytest
from scipy import stats

from pvfeas.laws import Array
from pvfeas.systematics import (
    averaged,
    dof_from_spread,
    group_freedom,
    log_student_tail,
    resets_per_second,
    size_in_hertz,
    surviving_significance,
    welch_satterthwaite,
)
from pvfeas.tables import Schedule, Systematic

CHECKS = {
    check["id"]: check
    for check in json.loads((Path(__file__).parent / "data" / "checks.json").read_text(encoding="utf-8"))
}
HOUR, DAY = 3600.0, 86400.0


def number(value: float) -> Array:
    return np.asarray(float(value))


def a_schedule(hours: float = 24.0, days: float = 7.0) -> Schedule:
    return Schedule(number(hours), number(days), number(0.2), number(0.9))


def a_systematic(size: float = 0.3, averages: str = "never", **more: Any) -> Systematic:
    return Systematic(name="some", size=number(size), averages=averages, **more)


@pytest.mark.parametrize(
    ("more", "expected"),
    [
        ({}, 0.3),
        ({"of": "one enantiomer"}, 0.3 * 2**0.5),
        ({"on": "width"}, 0.3 * 12e3),
        ({"on": "frequency"}, 0.3 * 29.1e12),
        ({"on": "width", "of": "one enantiomer"}, 0.3 * 12e3 * 2**0.5),
        ({"on": "scale"}, 0.3),
        ({"on": "signal"}, 0.3),
    ],
)
def test_sizes(more: dict[str, str], expected: float) -> None:
    found = size_in_hertz(a_systematic(**more), number(12e3), number(29.1e12))
    assert found == pytest.approx(expected, rel=1e-15)


@pytest.mark.parametrize("on", ["width", "frequency"])
def test_size_on_something_absent_is_refused(on: str) -> None:
    with pytest.raises(ValueError, match=f"a systematic on the {on} needs"):
        size_in_hertz(a_systematic(on=on), None, None)


def test_one_enantiomer_is_root_two_of_a_difference() -> None:
    """Two independent offsets, one of each enantiomer: their difference scatters sqrt 2 more."""
    offsets = np.random.default_rng(3).normal(0.0, 0.3, size=(2, 100_000))
    scatter = np.std(offsets[0] - offsets[1])
    expected = size_in_hertz(a_systematic(of="one enantiomer"), None, None)
    assert scatter == pytest.approx(float(expected), rel=4 / np.sqrt(2 * 100_000))


@pytest.mark.parametrize(
    ("every", "hours", "days", "resets"),
    [
        (DAY, 10, 5, 5.0),  # in a week: the five days of work
        (DAY, 10, 7, 7.0),
        (6 * HOUR, 10, 5, 28 * 5 / 7 * 10 / 24),
        (7 * DAY, 10, 5, 1.0),
        (14 * DAY, 10, 5, 0.5),
    ],
)
def test_resets_in_a_week(every: float, hours: float, days: float, resets: float) -> None:
    rate = resets_per_second(a_systematic(averages="per reset", every=number(every)), a_schedule(hours, days))
    assert rate * 7 * DAY == pytest.approx(resets, rel=1e-14)


@pytest.mark.parametrize("key", ["every", "after"])
def test_missing_times_are_refused(key: str) -> None:
    averages = "per reset" if key == "every" else "grows"
    with pytest.raises(ValueError, match=f"needs {key}"):
        averaged(a_systematic(averages=averages), number(0.3), number(1.0), number(1.0), a_schedule())


def test_how_each_kind_averages() -> None:
    """By hand, size 0.3 Hz, at 16 d of wall time with 4 d of live time."""
    wall, live, size = number(16 * DAY), number(4 * DAY), number(0.3)

    def left(averages: str, **more: Any) -> float:
        return float(averaged(a_systematic(averages=averages, **more), size, wall, live, a_schedule()))

    assert left("never") == 0.3
    assert left("per reset", every=number(DAY)) == pytest.approx(0.3 / 4, rel=1e-15)
    assert left("per reset", every=number(20 * DAY)) == 0.3  # not reset yet
    assert left("as 1/t", after=number(DAY)) == pytest.approx(0.3 / 2, rel=1e-15)
    assert left("grows", after=number(DAY)) == pytest.approx(0.3 * 2, rel=1e-15)


def test_per_reset_by_simulation() -> None:
    """A new offset each day, sixteen days: the mean offset is a quarter of one."""
    offsets = np.random.default_rng(5).normal(0.0, 0.3, size=(40_000, 16)).mean(axis=1)
    systematic = a_systematic(averages="per reset", every=number(DAY))
    expected = averaged(systematic, number(0.3), number(16 * DAY), number(16 * DAY), a_schedule())
    assert offsets.std() == pytest.approx(float(expected), rel=4 / np.sqrt(2 * 40_000))


@pytest.mark.parametrize("averages", ["as 1/t", "grows"])
@pytest.mark.parametrize("live", [0.0, 1.0, np.inf])
def test_a_size_of_zero_stays_zero(averages: str, live: float) -> None:
    systematic = a_systematic(averages=averages, after=number(DAY))
    assert averaged(systematic, np.zeros((1, 3)), number(live), number(live), a_schedule()) == pytest.approx(0.0, abs=0)


def test_gum_end_gauge() -> None:
    """JCGM 100:2008, H.1: combined uncertainty, effective degrees of freedom, 99 % expanded uncertainty."""
    check = CHECKS["gum.h1.exact"]
    given, expected = check["inputs"], check["expected"]
    parts = [number(u**2) for u in given["u_d"]]
    freedom_d = welch_satterthwaite(parts, [number(nu) for nu in given["nu_d"]])
    u_d = float(np.sqrt(sum(parts)))
    length, alpha = given["lS_nm"], 11.5e-6
    contributions = [
        given["u_lS"], u_d,
        length * abs(given["theta_mean"]) * 1e-6 / np.sqrt(3),  # difference of the expansion coefficients
        length * alpha * 0.05 / np.sqrt(3),  # difference of the temperatures
    ]  # fmt: skip
    variances = [number(u**2) for u in contributions]
    freedom = welch_satterthwaite(variances, [number(given["nu_lS"]), freedom_d, number(50), number(2)])
    u_c = float(np.sqrt(sum(variances)))
    expanded = float(stats.t.ppf(0.995, np.floor(freedom))) * u_c
    found = [length + given["d_nm"], u_d, float(freedom_d), u_c, float(freedom), expanded]
    assert found == pytest.approx(expected, rel=check["tolerance"]["rel"])


def test_gum_product_of_three() -> None:
    """JCGM 100:2008, G.4.1."""
    check = CHECKS["gum.g4.1"]
    relative = np.array(check["inputs"]["rel_u_percent"])
    freedom = welch_satterthwaite([number(u**2) for u in relative], [number(n - 1) for n in check["inputs"]["n"]])
    u_c = float(np.sqrt((relative**2).sum()))
    quantile = float(stats.t.ppf(0.975, np.floor(freedom)))
    assert [u_c, float(freedom), quantile, quantile * u_c] == pytest.approx(
        check["expected"], abs=check["tolerance"]["abs"]
    )


def test_no_doubt_is_infinitely_many_degrees() -> None:
    assert welch_satterthwaite([number(1.0), number(2.0)], [number(np.inf), number(np.inf)]) == np.inf
    assert welch_satterthwaite([number(0.0)], [number(3.0)]) == np.inf
    # a certain part dilutes the doubt: (1 + 3)^2 / (1/4)
    assert welch_satterthwaite([number(1.0), number(3.0)], [number(4.0), number(np.inf)]) == pytest.approx(64.0)


def test_degrees_of_a_group_by_simulation() -> None:
    """Sizes that are themselves uncertain and add linearly: the relative variance of their sum is 1/(2 nu)."""
    generator = np.random.default_rng(17)
    sizes, freedoms = np.array([1.0, 0.5, 2.0]), np.array([200.0, 80.0, 300.0])
    drawn = sizes * generator.normal(1.0, 1.0 / np.sqrt(2 * freedoms), size=(200_000, 3))
    spread = drawn.sum(axis=1).std() / sizes.sum()
    found = dof_from_spread(spread)
    expected = group_freedom([number(u) for u in sizes], [number(nu) for nu in freedoms])
    assert found == pytest.approx(float(expected), rel=4 * 2 / np.sqrt(2 * 200_000))


def test_degrees_of_freedom_of_a_spread() -> None:
    assert dof_from_spread(0.25) == pytest.approx(8.0, rel=1e-15)  # JCGM 100:2008, G.4.2
    assert dof_from_spread(np.log(1.5)) == pytest.approx(3.04, abs=0.005)
    assert dof_from_spread(0.0) == np.inf


def test_surviving_significance_as_the_decision_rules_state_it() -> None:
    assert surviving_significance(number(5), number(8)) == pytest.approx(3.28, abs=0.0051)
    # the rules round 3.0413 to 3.04 and 2.4349 to 2.43
    assert surviving_significance(number(5), dof_from_spread(np.log(1.5))) == pytest.approx(2.43, abs=0.0051)


@pytest.mark.parametrize("freedom", [1.0, 2.5, 8.0, 60.0, 1e4])
def test_surviving_significance_by_the_laws_themselves(freedom: float) -> None:
    k = np.array([0.1, 1.0, 2.9, 3.1, 5.0])
    expected = stats.norm.isf(stats.t.sf(k, freedom))
    assert surviving_significance(k, number(freedom)) == pytest.approx(expected, rel=1e-9)


@pytest.mark.parametrize("freedom", [1.0, 3.04, 50.0, 1e3, 1e7])
@pytest.mark.parametrize("k", [0.5, 2.99, 3.01, 5.0, 12.0, 40.0])
def test_student_tail_far_out(k: float, freedom: float) -> None:
    with mpmath.workdps(40):
        x = freedom / (mpmath.mpf(freedom) + mpmath.mpf(k) ** 2)
        exact = mpmath.log(mpmath.betainc(mpmath.mpf(freedom) / 2, 0.5, 0, x, regularized=True) / 2)
    assert log_student_tail(number(k), number(freedom)) == pytest.approx(float(exact), rel=1e-10)


def test_surviving_significance_at_its_ends() -> None:
    k = np.array([0.0, 5.0, 40.0, np.inf, -5.0])
    assert surviving_significance(k, number(np.inf)) == pytest.approx(k, rel=1e-12)
    assert surviving_significance(k, number(1e13)) == pytest.approx(k, rel=1e-9)
    few = surviving_significance(k, number(8.0))
    assert few[0] == 0.0
    assert few[1] == -few[4]
    assert few[3] == np.inf
    # nearly normal: k (1 - k^2/(4 nu)) to first order (Hill 1970, Commun. ACM 13, 617; from memory)
    assert 40.0 - surviving_significance(number(40), number(1e7)) == pytest.approx(40.0**3 / 4e7, rel=2e-3)


def test_surviving_significance_by_simulation() -> None:
    """Claims at 2.5 estimated sigma, the estimate with 8 degrees: as false as at the surviving significance."""
    generator = np.random.default_rng(19)
    count = 400_000
    estimate = np.sqrt(generator.chisquare(8, count) / 8)
    claimed = np.mean(generator.standard_normal(count) > 2.5 * estimate)
    p = float(stats.norm.sf(surviving_significance(number(2.5), number(8))))
    assert claimed == pytest.approx(p, abs=4 * np.sqrt(p / count))
