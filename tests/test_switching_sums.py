"""The closed sums of switching patterns against generalised covariances and Fourier series in many digits."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import mpmath
import numpy as np
import pytest

from pvfeas.patterns import Timing, default_live_fraction, distances, jumps, timing
from pvfeas.switching_noise import aliased_part, aliased_shape, aliased_uniform, flicker_runs, long_run
from pvfeas.techniques.free_decay import record_sensitivity

CHECKS = {
    one["id"]: one for one in json.loads((Path(__file__).parent / "data" / "checks.json").read_text(encoding="utf-8"))
}
KINDS = ("white", "flicker", "random-walk")
UNITS = tuple(tuple(np.asarray(float(kind == one)) for one in KINDS) for kind in KINDS)  # h of one kind alone
# pattern, dwell, dead time, live fraction (None: equal dwells)
CASES: tuple[tuple[str, float, float, float | None], ...] = (
    ("AB", 1.0, 0.0, None), ("AB", 7.0, 3.0, 0.3), ("ABBA", 2.0, 0.5, None), ("AAB", 1.0, 0.01, None),
    ("ACBC", 3.0, 0.2, 0.6), ("ACABBCB", 1.0, 4.0, 0.2), ("ABBABAAB", 1.0, 0.3, 0.5), ("A" * 5 + "B" * 3, 1.0, 1e-6, None),
)  # fmt: skip


def made(pattern: str, dwell: float, dead_time: float, fraction: float | None) -> Timing:
    share = default_live_fraction(pattern) if fraction is None else fraction
    return timing(pattern, np.asarray(dwell), np.asarray(dead_time), np.asarray(share))


def covariance(kind: str, time: Any) -> Any:
    """Generalised covariance of the phase over h (PHYSICS section 6)."""
    size = abs(time)
    if kind == "white":
        return -size / 4
    if kind == "random-walk":
        return mpmath.pi**2 / 6 * size**3
    return size**2 * mpmath.log(size) / 2 if size else mpmath.mpf(0)


def exact_variance(kind: str, places: list[Any], sizes: list[Any]) -> Any:
    """Variance over h of Σ over jumps, to 40 digits: minus or plus Σ_kl c_k c_l K(t_k - t_l), places in s, sizes in 1/s."""
    with mpmath.workdps(40):
        t, c = [mpmath.mpf(place) for place in places], [mpmath.mpf(size) for size in sizes]
        return sum(c[k] * c[i] * covariance(kind, t[k] - t[i]) for k in range(len(t)) for i in range(len(t)))


def weights_to_jumps(weights: list[Any]) -> tuple[list[Any], list[Any]]:
    """Jumps of bins one second long, one weight each."""
    padded = [0, *weights, 0]
    return list(range(len(weights) + 1)), [padded[i + 1] - padded[i] for i in range(len(weights) + 1)]


def letters_to_weights(pattern: str) -> list[Any]:
    of = {"A": mpmath.mpf(1) / pattern.count("A"), "B": -mpmath.mpf(1) / pattern.count("B")}
    return [of[letter] for letter in pattern]


FOUR, EIGHT = mpmath.mpf(4), mpmath.mpf(8)
# PHYSICS section 6: white Var T/h0, flicker Var/h-1, random walk Var/(h-2 tau), bias for t, t^2, t^3 (derived there)
TABLE: dict[str, tuple[list[Any], list[float]]] = {
    "AB": (letters_to_weights("AB"), [2, 2.772589, 13.159473, -1, 0, -0.5]),
    "ABA": (letters_to_weights("ABA"), [2.25, 1.687005, 4.934802, 0, 1, 0]),
    "ABBA": (letters_to_weights("ABBA"), [2, 1.569744, 6.579736, 0, 2, 0]),
    "ABAB": (letters_to_weights("ABAB"), [2, 1.202844, 6.579736, -1, 0, -3.5]),
    "(1,-3,3,-1)/4": ([1 / FOUR, -3 / FOUR, 3 / FOUR, -1 / FOUR], [2.5, 1.294569, 3.289868, 0, 0, -1.5]),
    "(1,-4,6,-4,1)/8": ([1 / EIGHT, -4 / EIGHT, 6 / EIGHT, -4 / EIGHT, 1 / EIGHT], [2.734375, 1.083497, 2.570209, 0, 0, 0]),
    "ABBABAAB": (letters_to_weights("ABBABAAB"), [2, 0.752142, 3.289868, 0, 0, -12]),
    "(AB)^4": (letters_to_weights("AB" * 4), [2, 0.535281, 3.289868, -1, 0, -15.5]),
    "(ABBA)^2": (letters_to_weights("ABBA" * 2), [2, 0.817602, 3.289868, 0, 2, 0]),
    "(AB)^8": (letters_to_weights("AB" * 8), [2, 0.245790, 1.644934, -1, 0, -63.5]),
    "(ABBA)^4": (letters_to_weights("ABBA" * 4), [2, 0.417456, 1.644934, 0, 2, 0]),
    "A^50 B^50": (letters_to_weights("A" * 50 + "B" * 50), [2, 2.772589, 657.97, -50, 0, -62500]),
}  # fmt: skip


def bias_of(places: list[Any], sizes: list[Any], power: int) -> Any:
    """∫ g t^power dt about the middle, from the jumps of g: -Σ c x^(power + 1)/(power + 1)."""
    middle = mpmath.mpf(places[-1]) / 2
    return -sum(c * (x - middle) ** (power + 1) for x, c in zip(places, sizes, strict=True)) / (power + 1)


@pytest.mark.parametrize("name", TABLE)
def test_the_covariances_here_give_the_table(name: str) -> None:
    """The route that the tests below trust, weights beyond A and B included; half a unit of the printed digits."""
    weights, expected = TABLE[name]
    places, sizes = weights_to_jumps(weights)
    found = [exact_variance(kind, places, sizes) for kind in KINDS]
    found = [found[0] * len(weights), found[1], found[2], *(bias_of(places, sizes, power) for power in (1, 2, 3))]
    assert [float(one) for one in found] == pytest.approx(expected, rel=6e-6, abs=6e-7)


@pytest.mark.parametrize(
    ("name", "place"),
    [
        ("abpattern.ABABA binom(1,-4,6,-4,1)/8", "(1,-4,6,-4,1)/8"), ("abpattern.ABBABAAB", "ABBABAAB"),
        ("abpattern.(ABBA)^4", "(ABBA)^4"), ("abpattern.A^50B^50", "A^50 B^50"),
    ],
)  # fmt: skip
def test_the_covariances_here_give_the_checks(name: str, place: str) -> None:
    weights, check = TABLE[place][0], CHECKS[name]
    found = [float(exact_variance(kind, *weights_to_jumps(weights))) for kind in KINDS]
    assert [found[0] * len(weights), *found[1:]] == pytest.approx(check["expected"], rel=check["tolerance"]["rel"])


@pytest.mark.parametrize(
    "name",
    ["ABA", "ABBA", "ABAB", "ABBABAAB", "(ABBA)^2", "(AB)^8", "(AB)^50", "(ABBA)^25", "ABAB binom(1,-3,3,-1)/4", "ABABA binom(1,-4,6,-4,1)/8"],
)  # fmt: skip
def test_bias_of_powers_of_time(name: str) -> None:
    """The jumps of a pattern carry the bias of any course of the frequency."""
    check = CHECKS[f"abpattern.drift.{name}"]
    if "binom" in name:
        places, sizes = weights_to_jumps(TABLE["(1,-3,3,-1)/4" if "-3,3" in name else "(1,-4,6,-4,1)/8"][0])
    else:
        single, _, times = name.strip("(").partition(")^")
        found = made(single * int(times or 1), 1.0, 0.0, None)
        shares, heights = jumps(found)
        order = np.argsort(shares, kind="stable")
        places, sizes = list(shares[order] * float(found.period)), list(heights[order] / float(found.period))
    found_bias = [float(bias_of(places, sizes, power)) for power in (1, 2, 3)]
    # shares are rounded to 1e-16 and enter with the fourth power of 100 dwells
    assert found_bias == pytest.approx(check["expected"], abs=max(check["tolerance"]["abs"], 1e-8 * len(sizes) / 100))


@pytest.mark.parametrize("case", CASES)
@pytest.mark.parametrize("runs", [1, 2, 3, 4, 9])
def test_finite_runs(case: tuple[str, float, float, float | None], runs: int) -> None:
    """All three kinds over whole patterns; 1e-10: sums of 1e2 products of 1e-16 that cancel by 1e3."""
    found = made(*case)
    shares, heights = jumps(found)
    period = float(found.period)
    places = [period * (n + share) for n in range(runs) for share in shares.tolist()]
    sizes = [height / (runs * period) for _ in range(runs) for height in heights.tolist()]
    passed = long_run(found)
    coefficients = (passed.white, passed.flicker + flicker_runs(found, runs)[-1], passed.random_walk)
    for kind, coefficient in zip(KINDS, coefficients, strict=True):
        expected = float(exact_variance(kind, places, sizes)) * runs * period
        assert float(coefficient) == pytest.approx(expected, rel=1e-10)


@pytest.mark.parametrize("case", CASES)
def test_long_runs_are_the_sums_over_harmonics(case: tuple[str, float, float, float | None]) -> None:
    """Σ_m |g_m|^2 m^-s, with |g_m|^2 as cosines over m^2 and each sum over m a polylogarithm; 2 pi^2 b^2 beside it."""
    found = made(*case)
    shares, heights = jumps(found)
    period = float(found.period)

    def harmonics(power: int) -> float:
        total = mpmath.mpf(0)
        for x, c in zip(shares.tolist(), heights.tolist(), strict=True):
            for other, d in zip(shares.tolist(), heights.tolist(), strict=True):
                total += c * d * mpmath.re(mpmath.polylog(2 + power, mpmath.expjpi(2 * (mpmath.mpf(x) - other))))
        return float(total / (4 * mpmath.pi**2)) * period**power

    passed = long_run(found)
    with mpmath.workdps(30):
        expected = (harmonics(0), harmonics(1), harmonics(2) + 2.0 * np.pi**2 * float(passed.bias) ** 2)
    # 1e-10 as above
    assert (float(passed.white), float(passed.flicker), float(passed.random_walk)) == pytest.approx(expected, rel=1e-10)


@pytest.mark.parametrize("pattern", ["AB", "AAB", "ABBA", "ACABBCB", "ABBABAAB"])
def test_distances_stand_for_all_pairs(pattern: str) -> None:
    """Σ_{k>l} c_k c_l F(|x_k - x_l|), F zero at zero, by the groups and by all pairs; an F nobody would choose."""
    found = made(pattern, 1.7, 0.31, 0.37)
    places, sizes = jumps(found)
    by_hand = sum(
        sizes[k] * sizes[i] * np.sinh(abs(places[k] - places[i])) for k in range(len(places)) for i in range(k)
    )
    grouped = sum(
        count * sizes[k] * sizes[i] * np.sinh(abs(places[group[0][0]] - places[group[0][1]]))
        for group in distances(pattern)
        for k, i, count in group
    )
    assert float(grouped) == pytest.approx(float(by_hand), rel=1e-12)


def test_arrays_of_draws() -> None:
    """Timings of every draw at once: the same bytes as each by itself."""
    random = np.random.default_rng(2)
    dwell, dead, share = (
        random.lognormal(2.0, 0.5, (3, 5)),
        random.uniform(0.0, 4.0, (1, 5)),
        random.uniform(0.2, 0.8, (3, 1)),
    )
    together = timing("ABBA", dwell, dead, share)
    passed, early = long_run(together), flicker_runs(together, 7)
    assert early.shape == (7, 3, 5)
    for row in range(3):
        for column in range(5):
            alone = timing("ABBA", dwell[row, column], dead[0, column], share[row, 0])
            single = long_run(alone)
            for name in ("white", "flicker", "random_walk", "bias"):
                assert getattr(passed, name)[row, column] == getattr(single, name)
            assert np.array_equal(early[:, row, column], flicker_runs(alone, 7))


@pytest.mark.parametrize("pattern", ["AB", "ABBA", "AAB", "ABBABAAB"])
def test_seam_of_the_exact_runs(pattern: str) -> None:
    """What early runs add, taken at 100 patterns and let fall as 1/N, against the exact runs: below 1 % of the whole."""
    found = made(pattern, 1.0, 0.2, None)
    early, long = flicker_runs(found, 3000), float(long_run(found).flicker)
    runs = np.arange(100, 3001)
    assert np.max(np.abs(early[99:] - early[99] * 100.0 / runs)) < 0.01 * long
    assert np.all(np.abs(np.diff(early[90:110])) < 1e-3 * long)  # no step at the seam


@pytest.mark.parametrize("fraction", [1.0, 0.9, 0.5, 0.1, 1e-3])
def test_part_of_a_cycle_evenly(fraction: float) -> None:
    """An even part is the closed form; 2e-4 of bins."""
    for levels in UNITS:
        expected = float(aliased_uniform(np.asarray(fraction), np.asarray(0.7), *levels))
        found = float(aliased_part(np.ones(64), np.asarray(fraction), np.asarray(0.7), *levels))
        assert found == pytest.approx(expected, rel=2e-3, abs=1e-12)


@pytest.mark.parametrize("fraction", [1.0, 0.5, 0.02])
@pytest.mark.parametrize("decay", [0.3, 1.0])
def test_part_of_a_cycle_against_its_series(fraction: float, decay: float) -> None:
    """A free decay seen in a part of each cycle: Fourier coefficients by Gauss nodes up to the 60th of the part.

    White by the mean square; for the rest the terms left out are below 1e-5 (a shape that starts and ends at zero).
    0.4 %: steps of 64 bins for the shorter decay.
    """
    nodes, weights = np.polynomial.legendre.leggauss(300)
    place, weights = (nodes + 1.0) / 2.0, weights / 2.0
    sensitivity = record_sensitivity(place, np.asarray(1.0), np.asarray(decay)) * weights
    mean = sensitivity.sum()
    orders = np.arange(1, int(60 / fraction) + 1)
    power = np.abs(np.exp(-2j * np.pi * fraction * np.outer(orders, place)) @ sensitivity / mean) ** 2
    white = ((sensitivity**2 / weights).sum() / mean**2 / fraction - 1.0) / 2.0
    bins = record_sensitivity((np.arange(64) + 0.5) / 64, np.asarray(1.0), np.asarray(decay))
    cycle = 0.7
    found = [float(aliased_part(bins, np.asarray(fraction), np.asarray(cycle), *levels)) for levels in UNITS]
    assert found == pytest.approx(
        [white, cycle * (power / orders).sum(), cycle**2 * (power / orders**2).sum()], rel=4e-3
    )


def test_part_of_a_cycle_is_the_whole_shape() -> None:
    """Looking all the time: as sampled over the whole cycle, for a shape that the bins resolve; 1e-3 of the steps."""
    shape = np.sin(np.pi * (np.arange(256) + 0.5) / 256) ** 2
    for levels in UNITS:
        expected = float(aliased_shape(shape, np.asarray(0.7), *levels))
        assert float(aliased_part(shape, np.asarray(1.0), np.asarray(0.7), *levels)) == pytest.approx(
            expected, rel=1e-3
        )


def test_a_very_short_part() -> None:
    """A record of 1e-5 of the cycle: white by cycle over record, flicker by its logarithm; nothing is NaN."""
    shape = np.sin(np.pi * (np.arange(64) + 0.5) / 64) ** 2
    short, shorter = (
        [float(aliased_part(shape, np.asarray(r), np.asarray(1.0), *levels)) for levels in UNITS] for r in (1e-4, 1e-5)
    )
    assert shorter[0] == pytest.approx(0.75e5, rel=1e-3)  # mean square 3/2, half of it over r
    assert shorter[1] - short[1] == pytest.approx(np.log(10.0), rel=1e-6)
    assert shorter[2] == pytest.approx(np.pi**2 / 6.0, rel=1e-4)


def _cycles(found: Timing, count: int, fraction: float) -> tuple[list[float], list[float]]:
    """Jumps of one pattern whose dwells are `count` cycles of 1 s, looking in the first part of each; s and 1/s."""
    places, sizes = [], []
    on = {
        letter: sum(float(e - b) for p, b, e in zip(found.pattern, found.begin, found.end, strict=True) if p == letter)
        for letter in "AB"
    }
    for letter, begin in zip(found.pattern, found.begin, strict=True):
        value = {"A": 1.0, "B": -1.0}[letter] / (on[letter] * fraction)
        for cycle in range(count):
            places += [float(begin) + cycle, float(begin) + cycle + fraction]
            sizes += [value, -value]
    return places, sizes


@pytest.mark.parametrize("pattern", ["AB", "ABBA", "AAB"])
@pytest.mark.parametrize(("count", "bound"), [(5, 0.03), (10, 0.01)])
@pytest.mark.parametrize("fraction", [0.2, 0.5, 0.9])
def test_idle_time_within_dwells(pattern: str, count: int, bound: float, fraction: float) -> None:
    """Pattern and cycles apart, as in use, against every cycle in the weight: 1 % low at most from ten cycles a dwell."""
    found = made(pattern, float(count), 0.0, None)
    share = default_live_fraction(pattern)
    places, sizes = _cycles(found, count, fraction)
    period, arms = float(found.period), 1.0 / share + 1.0 / (1.0 - share)
    passed = long_run(found)
    coarse = (passed.white, passed.flicker + flicker_runs(found, 1)[0], passed.random_walk)
    for kind, levels, value in zip(KINDS, UNITS, coarse, strict=True):
        apart = float(value) + arms * float(aliased_uniform(np.asarray(fraction), np.asarray(1.0), *levels))
        exact = float(exact_variance(kind, places, sizes)) * period
        assert apart == pytest.approx(exact, rel=1e-9 if kind == "white" else bound)
        assert apart <= exact * (1.0 + 1e-9)
