"""Reference noise through switching patterns: sums against tables, direct integrals and simulated noise.

Values from tests/data/checks.json, groups allan, abpattern and noise; each entry says its source.
"""

from __future__ import annotations

import json
from itertools import pairwise
from pathlib import Path

import numpy as np
import pytest
from scipy import integrate, optimize

from pvfeas.frequency_noise import allan_variance, level_of_deviation, levels_of_table
from pvfeas.patterns import Timing, default_live_fraction, drift_bias, faults_of, jumps, timing
from pvfeas.switching_noise import (
    aliased_shape,
    aliased_uniform,
    cosine_sum_3,
    cosine_sum_4,
    flicker_runs,
    long_run,
)

CHECKS = {
    one["id"]: one for one in json.loads((Path(__file__).parent / "data" / "checks.json").read_text(encoding="utf-8"))
}
PATTERNS = ("AB", "ABA", "ABBA", "ABAB", "ABBABAAB", "ABBAABBA", "ABBA" * 4, "AB" * 8, "AB" * 50, "A" * 50 + "B" * 50)


def at(pattern: str, dwell: float = 1.0, dead_time: float = 0.0, fraction: float | None = None) -> Timing:
    share = default_live_fraction(pattern) if fraction is None else fraction
    return timing(pattern, np.asarray(dwell), np.asarray(dead_time), np.asarray(share))


def one_run(pattern: str, **more: float) -> np.ndarray:
    """Variance × time over h for one pass of the pattern: white, flicker over h-1, random walk over h-2."""
    found = at(pattern, **more)
    passed = long_run(found)
    return np.array([passed.white, passed.flicker + flicker_runs(found, 1)[0], passed.random_walk])


@pytest.mark.parametrize("share", [0.0, 1e-6, 0.01, 0.25, 0.5, 0.7, 0.999])
def test_cosine_sums(share: float) -> None:
    """Against the sums themselves, the rest beyond 10^5 terms bounded by its integral."""
    m = np.arange(1, 100_001)
    for function, power in ((cosine_sum_3, 3.0), (cosine_sum_4, 4.0)):
        direct = float((np.cos(2.0 * np.pi * m * share) / m**power)[::-1].sum())
        rest = 1e5 ** (1.0 - power) / (power - 1.0)
        assert abs(float(function(np.asarray(share))) - direct) < rest + 1e-12


@pytest.mark.parametrize(
    ("name", "pattern"),
    [
        ("abpattern.ABA", "ABA"), ("abpattern.ABBA", "ABBA"), ("abpattern.ABBABAAB", "ABBABAAB"),
        ("abpattern.(ABBA)^4", "ABBA" * 4), ("abpattern.(AB)^50", "AB" * 50), ("abpattern.A^50B^50", "A" * 50 + "B" * 50),
    ],
)  # fmt: skip
def test_table_of_patterns(name: str, pattern: str) -> None:
    """White variance × time over h0, flicker variance over h-1, random-walk variance over h-2 and the dwell."""
    length = len(pattern)
    white, flicker, walk = one_run(pattern)
    expected, tolerance = CHECKS[name]["expected"], CHECKS[name]["tolerance"]["rel"]
    assert [white, flicker / length, walk / length] == pytest.approx(expected, rel=tolerance)


@pytest.mark.parametrize(
    ("name", "pattern"),
    [
        ("abpattern.drift.ABA", "ABA"), ("abpattern.drift.ABBA", "ABBA"), ("abpattern.drift.ABAB", "ABAB"),
        ("abpattern.drift.ABBABAAB", "ABBABAAB"), ("abpattern.drift.(ABBA)^2", "ABBA" * 2), ("abpattern.drift.(AB)^8", "AB" * 8),
        ("abpattern.drift.(AB)^50", "AB" * 50), ("abpattern.drift.(ABBA)^25", "ABBA" * 25),
    ],
)  # fmt: skip
def test_drift_bias(name: str, pattern: str) -> None:
    tolerance = CHECKS[name]["tolerance"]["abs"]
    assert float(drift_bias(at(pattern))) == pytest.approx(CHECKS[name]["expected"][0], abs=tolerance)


def test_long_runs_in_allan_deviations() -> None:
    """(tau/T)[4 sW^2 + 2.46 sF^2 + 4 sRW^2] for AB without end, each s the Allan deviation at the dwell."""
    passed = long_run(at("AB"))
    levels = [
        float(level_of_deviation(kind, np.asarray(1.0), np.asarray(1.0)))
        for kind in ("white", "flicker", "random-walk")
    ]
    found = [
        float(p) * level for p, level in zip((passed.white, passed.flicker, passed.random_walk), levels, strict=True)
    ]
    check = CHECKS["abpattern.asym.adev_units"]
    assert found == pytest.approx(check["expected"], rel=check["tolerance"]["rel"])


def _dead_after_every_dwell(pattern: str, ratio: float) -> Timing:
    """The same with a letter of its own for the dead time, which then follows every dwell, equal neighbours too."""
    dwell, dead = {0: (1, 0), 0.1: (10, 1), 0.5: (2, 1), 1: (1, 1), 4: (1, 4), 9: (1, 9)}[ratio]
    return at("".join(letter * dwell + "C" * dead for letter in pattern), dwell=1.0 / dwell)


@pytest.mark.parametrize("ratio", [0, 0.1, 0.5, 1, 4, 9])
def test_dead_time_table(ratio: float) -> None:
    """There a dead time follows every dwell; AB has it so by itself. One pass: the last dead time does not matter."""
    check = CHECKS["abpattern.deadtime"]
    place, tolerance = check["inputs"]["dead_over_tau"].index(ratio), check["tolerance"]["rel"]
    for row, cases in enumerate(
        [(at("AB", dead_time=ratio), _dead_after_every_dwell("AB", ratio)), (_dead_after_every_dwell("ABBA", ratio),)]
    ):
        for found in cases:
            flicker = float((long_run(found).flicker + flicker_runs(found, 1)[0]) / found.period)
            assert flicker == pytest.approx(check["expected"][row][place], rel=tolerance)


@pytest.mark.parametrize(("pattern", "slope"), [("AB", 1.5), ("ABBA", 1.5), ("ABA", 2.0)])
@pytest.mark.parametrize("ratio", [0.1, 0.5, 1, 4])
def test_dead_time_and_random_walk(pattern: str, slope: float, ratio: float) -> None:
    """Variance of one pass × (1 + slope × dead/dwell) (PHYSICS section 6, derived there), dead time after every dwell."""
    plain, found = at(pattern), _dead_after_every_dwell(pattern, ratio)
    expected = float(long_run(plain).random_walk / plain.period) * (1.0 + slope * ratio)
    assert float(long_run(found).random_walk / found.period) == pytest.approx(expected, rel=1e-12)


def test_allan_variances() -> None:
    check, one = CHECKS["allan.powerlaw"], np.ones(())
    found = [allan_variance(*levels, one) for levels in ((0, 0, one), (0, one, 0), (one, 0, 0))]
    assert [float(value) for value in found] == pytest.approx(check["expected"], rel=check["tolerance"]["rel"])
    assert float(allan_variance(one, 0 * one, 0 * one, one)) == pytest.approx(CHECKS["noise.mean_of_white"]["expected"])


@pytest.mark.parametrize("kind", ["white", "flicker", "random-walk"])
def test_levels_give_back_their_deviation(kind: str) -> None:
    level = level_of_deviation(kind, np.asarray(0.7), np.asarray(3.0))
    levels = [level if kind == one else 0.0 for one in ("white", "flicker", "random-walk")]
    assert np.sqrt(allan_variance(*levels, np.asarray(3.0))) == pytest.approx(0.7, rel=1e-14)


def test_a_table_of_deviations_is_taken_apart() -> None:
    """Exact deviations of a mixture give the mixture; a kind that is not there comes out as nothing."""
    tau = np.array([0.1, 1.0, 10.0, 100.0, 1000.0])
    for levels in ((9.0, 0.04, 1e-5), (4.0, 0.0, 0.0), (0.0, 0.2, 3e-6)):
        found = levels_of_table(tau, np.sqrt(allan_variance(*(np.asarray(one) for one in levels), tau)))
        assert found == pytest.approx(levels, rel=1e-9, abs=1e-12)


def test_a_table_is_fitted_as_well_as_can_be() -> None:
    """Deviations that no mixture has: the same as a bounded minimisation of the relative misfit, and positive."""
    tau, deviation = np.array([1.0, 3.0, 10.0, 30.0, 100.0, 300.0]), np.array([5.0, 3.3, 1.3, 1.1, 1.9, 6.0])
    found = levels_of_table(tau, deviation)

    def misfit(logs: np.ndarray) -> float:
        return float(np.sum((allan_variance(*np.exp(logs), tau) / deviation**2 - 1.0) ** 2))

    best = optimize.minimize(
        misfit, [3.0, -3.0, -4.0], method="Nelder-Mead", options={"xatol": 1e-9, "fatol": 1e-13, "maxiter": 9000}
    )
    with np.errstate(divide="ignore"):
        assert misfit(np.log(found)) <= best.fun * (1.0 + 1e-9)
    assert min(found) >= 0.0


@pytest.mark.parametrize(
    ("tau", "deviation", "word"),
    [
        ([1.0, 2.0], [1.0], "one deviation for each"),
        ([], [], "one deviation"),
        ([1.0], [0.0], "positive"),
        ([0.0], [1.0], "positive"),
    ],
)
def test_tables_that_cannot_be(tau: list[float], deviation: list[float], word: str) -> None:
    with pytest.raises(ValueError, match=word):
        levels_of_table(np.array(tau), np.array(deviation))


@pytest.mark.parametrize("pattern", ["AB", "ABBA", "ACBC", "AAB"])
@pytest.mark.parametrize("dead_time", [0.0, 0.3])
def test_against_the_integral_over_frequency(pattern: str, dead_time: float) -> None:
    """Var = ∫ S(f) |G(f)|^2 df of 3 patterns, G the transform of the weight; 1e-3: the integral's own cut at high f."""
    found, runs = at(pattern, dead_time=dead_time), 3
    places, sizes = jumps(found)
    period = float(found.period)
    times = np.concatenate([(places + n) * period for n in range(runs)])
    steps = np.tile(sizes, runs) / (runs * period)

    def gain(f: float) -> float:
        return float(abs((steps * np.exp(-2j * np.pi * f * times)).sum()) ** 2 / (2.0 * np.pi * f) ** 2)

    edges = np.concatenate([[1e-7, 1e-3, 0.02], np.arange(0.05, 12.0, 0.05)])

    def integral(power: float) -> float:
        return sum(integrate.quad(lambda f: f**power * gain(f), a, b, epsrel=1e-7)[0] for a, b in pairwise(edges))

    passed = long_run(found)
    flicker = float(passed.flicker + flicker_runs(found, runs)[-1]) / (runs * period)
    walk = float(passed.random_walk) / (runs * period)
    assert flicker == pytest.approx(integral(-1.0), rel=1e-3)
    assert walk == pytest.approx(integral(-2.0), rel=1e-3)


# Simulated noise: exact covariances of the phase at the jumps, by Cholesky; the difference formed from its increments.


CAMPAIGNS, RUNS, STEPS, LONGER = 16_000, 2, 12, 16  # STEPS a letter; the lowest frequency is 1/LONGER of the run


def _drawn(found: Timing, kind: str, seed: int) -> np.ndarray:
    """A minus B of simulated campaigns over whole patterns, from simulated frequency on a grid."""
    random = np.random.default_rng(seed)
    steps = STEPS * len(found.pattern)
    dt, total = float(found.period) / steps, steps * RUNS
    edges = np.arange(steps + 1) * dt
    places, sizes = jumps(found)
    # the integral of the weight over each step, exactly, so that the grid need not meet the dwells
    ramps = np.maximum(edges[None] - places[:, None] * float(found.period), 0.0) * sizes[:, None]
    weight = np.tile(np.diff(ramps.sum(axis=0)) / dt, RUNS)
    if kind == "random-walk":  # a walk whose steps have variance 2 pi^2 h-2 dt, its mean over each step
        jump = random.standard_normal((CAMPAIGNS, total)) * np.sqrt(2.0 * np.pi**2 * dt)
        noise = np.cumsum(jump, axis=1) - 0.5 * jump
    else:
        frequencies = np.fft.rfftfreq(LONGER * total, dt)
        size = np.zeros_like(frequencies)
        size[1:] = 1.0 / frequencies[1:]
        both = random.standard_normal((2, CAMPAIGNS, frequencies.size), dtype=np.float32)
        spectrum = (both[0] + 1j * both[1]) * np.sqrt(size / 4.0 * LONGER * total / dt).astype(np.float32)
        noise = np.fft.irfft(spectrum, axis=1)[:, :total]
    return np.asarray((noise * weight).mean(axis=1))


@pytest.mark.parametrize("pattern", ["AB", "ABA", "ABBA", "ABAB", "ABBABAAB"])
@pytest.mark.parametrize("dead_time", [0.0, 0.5])
@pytest.mark.parametrize("kind", ["flicker", "random-walk"])
def test_simulated_noise(pattern: str, dead_time: float, kind: str) -> None:
    """Standard error of sigma 1/sqrt(2 × campaigns) = 0.56 %; bound three of them and 0.5 % for grid and lowest frequency."""
    found = at(pattern, dead_time=dead_time)
    simulated = _drawn(found, kind, 7)
    passed = long_run(found)
    coefficient = passed.random_walk if kind == "random-walk" else passed.flicker + flicker_runs(found, RUNS)[-1]
    predicted = np.sqrt(float(coefficient) / (RUNS * float(found.period)))
    ratio = float(np.sqrt(np.mean(simulated**2))) / predicted
    bound = 3.0 / np.sqrt(2.0 * CAMPAIGNS) + 0.005
    assert abs(ratio - 1.0) < bound
    assert abs(ratio / 1.05 - 1.0) > bound  # a prediction off by 5 % does not pass


@pytest.mark.parametrize("pattern", ["AB", "ABA", "ABBA", "ACBC", "ABBABAAB"])
@pytest.mark.parametrize("dead_time", [0.0, 3.0])
@pytest.mark.parametrize("kind", ["white", "flicker", "random-walk"])
def test_simulated_noise_with_idle_time(pattern: str, dead_time: float, kind: str) -> None:
    """Dwells of ten cycles of 1 s that look during their first half, on a grid of 1/8 s; two patterns, 6000 campaigns.

    Standard error of sigma 0.91 %; bound three of them and 0.8 %: cycles against dwell 0.5 %, grid 0.3 %.
    """
    found, count, steps_a_cycle, longer = at(pattern, dwell=10.0, dead_time=dead_time), 6000, 8, 8
    total = round(float(found.period) * steps_a_cycle)
    dt = 1.0 / steps_a_cycle
    middle = (np.arange(total) + 0.5) * dt
    weight = np.zeros(total)
    on_a, on_b = (10.0 * pattern.count(letter) for letter in "AB")
    for letter, begin, end in zip(pattern, found.begin, found.end, strict=True):
        looking = (middle > begin) & (middle < end) & ((middle - begin) % 1.0 < 0.5)
        weight += looking * {"A": 2.0 / on_a, "B": -2.0 / on_b}.get(letter, 0.0) * dt / RUNS
    weight, random = np.tile(weight, RUNS), np.random.default_rng(13)
    results = []
    for _ in range(6):
        shape = (count // 6, weight.size)
        if kind == "white":
            noise = random.standard_normal(shape) * np.sqrt(0.5 / dt)
        elif kind == "random-walk":
            jump = random.standard_normal(shape) * np.sqrt(2.0 * np.pi**2 * dt)
            noise = np.cumsum(jump, axis=1) - 0.5 * jump
        else:
            frequencies = np.fft.rfftfreq(longer * weight.size, dt)[1:]
            both = random.standard_normal((2, shape[0], frequencies.size), dtype=np.float32)
            size = np.sqrt(longer * weight.size / (4.0 * dt * frequencies)).astype(np.float32)
            spectrum = np.pad((both[0] + 1j * both[1]) * size, ((0, 0), (1, 0)))
            noise = np.fft.irfft(spectrum, axis=1)[:, : weight.size]
        results.append((noise * weight).sum(axis=1))
    passed, levels = long_run(found), [np.asarray(float(kind == one)) for one in ("white", "flicker", "random-walk")]
    within = (
        float(aliased_uniform(np.asarray(0.5), np.asarray(1.0), *levels)) * float(found.period) * (1 / on_a + 1 / on_b)
    )
    early = float(flicker_runs(found, RUNS)[-1]) * float(levels[1])
    predicted = np.sqrt((float(passed.total(*levels)) + early + within) / (RUNS * float(found.period)))
    ratio = float(np.sqrt(np.mean(np.concatenate(results) ** 2))) / predicted
    assert abs(ratio - 1.0) < 3.0 / np.sqrt(2.0 * count) + 0.008


@pytest.mark.parametrize("pattern", ["AB", "ABBA", "AAB", "ACBC", "ABBABAAB"])
def test_simulated_drift(pattern: str) -> None:
    """A frequency that rises linearly, averaged over the dwells on a fine grid."""
    found = at(pattern, dead_time=0.3)
    middle = (np.arange(200_000) + 0.5) * float(found.period) / 200_000
    places, sizes = jumps(found)
    weight = (np.heaviside(middle[None] - places[:, None] * float(found.period), 0.5) * sizes[:, None]).sum(axis=0)
    assert float(drift_bias(found)) == pytest.approx(float((weight * middle).mean()), abs=1e-4)  # of the grid


def test_beyond_the_exact_runs() -> None:
    """What early runs add falls as 1/N: at 200 patterns half of what it is at 100, to 0.3 % of the long-run sum."""
    for pattern in ("AB", "ABBA", "AAB"):
        found = at(pattern, dead_time=0.2)
        early, later = flicker_runs(found, 100)[-1], flicker_runs(found, 200)[-1]
        assert abs(later - early / 2.0) < 0.003 * float(long_run(found).flicker)


def test_white_noise_is_live_time_only() -> None:
    """4 a^2/t_live for equal arms, a^2 = h0/2: 2 h0/live whatever the order and the dead time."""
    for pattern in PATTERNS:
        found = at(pattern, dead_time=0.4)
        assert float(long_run(found).white) == pytest.approx(_white_by_hand(found), rel=1e-9)


def _white_by_hand(found: Timing) -> float:
    on_a = sum(float(found.end[i] - found.begin[i]) for i, letter in enumerate(found.pattern) if letter == "A")
    on_b = float(found.live) - on_a
    return 0.5 * float(found.period) * (1.0 / on_a + 1.0 / on_b)  # h0/(2 t_A) + h0/(2 t_B), × elapsed


def test_live_fraction_sets_the_dwells() -> None:
    found = at("AB", dwell=10.0, fraction=0.2)
    assert float(found.end[0] - found.begin[0]) == pytest.approx(4.0)
    assert float(found.end[1] - found.begin[1]) == pytest.approx(16.0)


@pytest.mark.parametrize("fraction", [0.1, 0.5, 0.9, 1.0])
def test_idle_time_lets_noise_in(fraction: float) -> None:
    """White: cycle over free time; all kinds against the Fourier sum of a rectangle (10^6 terms; sin^2 averages to 1/2 in the rest)."""
    cycle, one, zero = 0.7, np.ones(()), np.zeros(())
    k = np.arange(1, 1_000_001)
    power = np.sinc(k * fraction) ** 2
    expected = [power.sum(), cycle * (power / k).sum(), cycle**2 * (power / k**2).sum()]
    found = [
        float(aliased_uniform(np.asarray(fraction), np.asarray(cycle), *levels))
        for levels in ((one, zero, zero), (zero, one, zero), (zero, zero, one))
    ]
    assert found == pytest.approx(expected, abs=1.1 / (2.0 * np.pi**2 * fraction**2 * 1e6) + 1e-9)
    assert found[0] == pytest.approx((1.0 / fraction - 1.0) / 2.0)


def test_a_sampled_shape_is_its_closed_form() -> None:
    """sin^2 along a cycle: s_1 = 1/2 only."""
    place = (np.arange(64) + 0.5) / 64
    shape, cycle, one, zero = np.sin(np.pi * place) ** 2, np.asarray(0.7), np.ones(()), np.zeros(())
    assert float(aliased_shape(shape, cycle, one, zero, zero)) == pytest.approx(0.25)
    assert float(aliased_shape(shape, cycle, zero, one, zero)) == pytest.approx(0.7 * 0.25)
    assert float(aliased_shape(shape, cycle, zero, zero, one)) == pytest.approx(0.49 * 0.25)


@pytest.mark.parametrize(
    ("pattern", "word"),
    [("abba", "capital"), ("A B", "capital"), ("AAC", "both A and B"), ("", "capital"), ("AB" * 40, "64")],
)
def test_patterns_that_cannot_be(pattern: str, word: str) -> None:
    assert word in faults_of(pattern)


@pytest.mark.parametrize("pattern", PATTERNS[:-2])
def test_patterns_that_can_be(pattern: str) -> None:
    assert faults_of(pattern) == ""
