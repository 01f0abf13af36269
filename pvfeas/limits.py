"""Limits on |splitting|: constructions that turn an outcome into a bound, all in units of sigma.

x is the outcome over sigma: signed where the sign is predicted (feldman-cousins-bounded, cls),
its size otherwise.
"""

from __future__ import annotations

from collections.abc import Callable
from functools import lru_cache

import numpy as np
from numpy.typing import ArrayLike
from scipy import special

from pvfeas.laws import Array

SIGNED = ("feldman-cousins-bounded", "cls")
UNSIGNED = ("abs-plus-z", "feldman-cousins-abs", "flat-prior-abs")
GRID_END, GRID_STEP = 12.0, 0.02
ITERATIONS = 80


def one_sided_z(confidence: ArrayLike) -> Array:
    """z with Phi(z) = confidence."""
    return np.asarray(special.ndtri(confidence))


def two_sided_z(confidence: ArrayLike) -> Array:
    """z with 2 Phi(z) - 1 = confidence."""
    return np.asarray(special.ndtri((1.0 + np.asarray(confidence)) / 2.0))


def _bisect(rises: Callable[[Array], Array], low: Array, high: Array) -> Array:
    """Where a rising function becomes positive, element by element."""
    low, high = np.array(low, dtype=float), np.array(high, dtype=float)
    for _ in range(ITERATIONS):
        middle = (low + high) / 2.0
        positive = rises(middle) > 0
        low, high = np.where(positive, low, middle), np.where(positive, middle, high)
    return np.asarray((low + high) / 2.0)


def abs_plus_z(x: ArrayLike, confidence: float) -> Array:
    """L = |x| + z with z two-sided at the confidence: covers whatever the sign, never below z.

    Common practice for null results; for a mean bounded at 0 it is the Feldman–Cousins upper end for x >= 0.
    """
    return np.abs(x) + two_sided_z(confidence)


def cls(x: ArrayLike, confidence: float) -> Array:
    """L = x + Phi^-1(1 - alpha Phi(x)), alpha = 1 - confidence (Cowan et al. 2011, Eur. Phys. J. C 71, 1554).

    For a splitting of predicted sign; also the flat-prior upper limit on a mean bounded at 0.
    """
    value = np.asarray(x, dtype=float)
    return np.asarray(value - special.ndtri((1.0 - confidence) * special.ndtr(value)))


def flat_prior_abs(x: ArrayLike, confidence: float) -> Array:
    """Posterior quantile of |d| for a flat prior on d and a normal outcome.

    Phi(L - |x|) - Phi(-L - |x|) = confidence. Flat in d is flat in |d| with the folded likelihood.
    """
    size = np.abs(np.asarray(x, dtype=float))

    def over(limit: Array) -> Array:
        return special.ndtr(limit - size) - special.ndtr(-limit - size) - confidence

    return _bisect(over, np.zeros_like(size), size + 12.0)


def feldman_cousins_interval(x: ArrayLike, confidence: float) -> tuple[Array, Array]:
    """Unified interval for the mean of a normal outcome with unit sigma, mean >= 0.

    Feldman & Cousins 1998, Phys. Rev. D 57, 3873, Table X. The acceptance interval of mean m has
    equal likelihood ratios at its ends: x2 = upper end, x1 = m - (x2 - m) if positive, else
    x1 = m/2 - (x2 - m)^2/(2 m); the interval is the set of m that accept x.
    """
    value = np.asarray(x, dtype=float)
    upper = _bisect(lambda m: _lower_end(m, confidence) - value, np.full_like(value, 1e-9), np.abs(value) + 12.0)
    lower = _bisect(lambda m: _upper_end(m, confidence) - value, np.full_like(value, 1e-9), np.abs(value) + 12.0)
    return np.where(lower < 1e-8, 0.0, lower), np.asarray(upper)


def _upper_end(mean: Array, confidence: float) -> Array:
    """x2 with Phi(x2 - m) - Phi(x1(x2) - m) = confidence."""

    def over(x2: Array) -> Array:
        return special.ndtr(x2 - mean) - special.ndtr(_partner(x2, mean) - mean) - confidence

    return _bisect(over, mean, mean + 12.0)


def _lower_end(mean: Array, confidence: float) -> Array:
    return _partner(_upper_end(mean, confidence), mean)


def _partner(x2: Array, mean: Array) -> Array:
    """The lower end with the same likelihood ratio as x2 >= mean."""
    mirrored = 2.0 * mean - x2
    with np.errstate(over="ignore", divide="ignore"):
        below_zero = mean / 2.0 - (x2 - mean) ** 2 / (2.0 * mean)
    return np.asarray(np.where(mirrored >= 0.0, mirrored, below_zero))


def feldman_cousins_bounded(x: ArrayLike, confidence: float) -> Array:
    """Upper end of the unified interval for a mean bounded at 0 (sign predicted)."""
    return feldman_cousins_interval(x, confidence)[1]


def feldman_cousins_abs(x: ArrayLike, confidence: float) -> Array:
    """Upper end of the likelihood-ratio ordered interval on |x| for |d| >= 0, interpolated from a table.

    Ordering of Feldman & Cousins 1998 applied to the folded normal outcome |x|: this is another
    construction than their Table X.
    """
    size = np.abs(np.asarray(x, dtype=float))
    grid, upper = _abs_table(float(confidence))
    far = size + one_sided_z((1.0 + confidence) / 2.0)
    return np.where(size < GRID_END - 1.0, np.interp(size, grid, upper), far)


def _folded_density(y: Array, mean: Array) -> Array:
    """Density of |x| up to 1/sqrt(2 pi): exp(-(y - m)^2/2) + exp(-(y + m)^2/2)."""
    return np.asarray(np.exp(-0.5 * (y - mean) ** 2) + np.exp(-0.5 * (y + mean) ** 2))


@lru_cache(maxsize=16)
def _best_mean_table() -> tuple[Array, Array]:
    """The mean of greatest folded likelihood for each |x|: m = x tanh(m x), zero for |x| <= 1."""
    y = np.arange(0.0, GRID_END + 14.0, GRID_STEP / 4.0)
    mean = y.copy()
    for _ in range(400):
        mean = y * np.tanh(mean * y)
    mean = np.where(y <= 1.0, 0.0, mean)
    for _ in range(50):  # Newton where the fixed point creeps, just above 1
        slope = 1.0 - y**2 / np.cosh(np.minimum(mean * y, 300.0)) ** 2
        step = np.where((y > 1.0) & (slope > 1e-12), (mean - y * np.tanh(mean * y)) / np.maximum(slope, 1e-12), 0.0)
        mean = np.maximum(mean - step, 0.0)
    return y, mean


@lru_cache(maxsize=16)
def _abs_table(confidence: float) -> tuple[Array, Array]:
    """|x| and the upper end of the interval, from the acceptance intervals of a grid of means."""
    y, best = _best_mean_table()
    top = np.log(_folded_density(y, best))
    means = np.arange(GRID_STEP, GRID_END + 6.0, GRID_STEP)
    ends = np.array([_acceptance(mean, y, top, confidence)[0] for mean in means])
    sizes = np.arange(0.0, GRID_END, GRID_STEP)
    return sizes, np.interp(sizes, np.maximum.accumulate(ends), means)


def _acceptance(mean: float, y: Array, top: Array, confidence: float) -> tuple[float, float]:
    """[y1, y2] of the likelihood-ratio ordering with the wanted probability of |x|."""
    ratio = np.log(_folded_density(y, np.asarray(mean))) - top
    peak = int(np.argmax(ratio))
    rising, falling = ratio[: peak + 1], ratio[peak:]

    def ends(level: Array) -> tuple[float, float]:
        first = 0.0 if rising[0] > level else float(np.interp(level, rising, y[: peak + 1]))
        return first, float(np.interp(-level, -falling, y[peak:]))

    low, high = np.array(-60.0), np.array(ratio[peak])
    for _ in range(60):
        level = (low + high) / 2.0
        y1, y2 = ends(level)
        inside = special.ndtr(y2 - mean) - special.ndtr(y1 - mean)
        inside += special.ndtr(-y1 - mean) - special.ndtr(-y2 - mean)
        low, high = (level, high) if inside > confidence else (low, level)
    return ends(low)


CONSTRUCTIONS: dict[str, Callable[[ArrayLike, float], Array]] = {
    "abs-plus-z": abs_plus_z,
    "feldman-cousins-abs": feldman_cousins_abs,
    "flat-prior-abs": flat_prior_abs,
    "feldman-cousins-bounded": feldman_cousins_bounded,
    "cls": cls,
}


def limit(construction: str, x: ArrayLike, confidence: float) -> Array:
    """The limit over sigma for an outcome over sigma."""
    return CONSTRUCTIONS[construction](x, confidence)


def outcome_quantile(construction: str, power: float) -> float:
    """The outcome over sigma below which the share `power` of outcomes without splitting lies.

    |x|: Phi^-1((1 + power)/2); signed x: Phi^-1(power).
    """
    return float(one_sided_z(power) if construction in SIGNED else two_sided_z(power))


def planned_limit(construction: str, confidence: float, power: float) -> float:
    """Limit over sigma that is met with the given power if there is no splitting."""
    return float(limit(construction, outcome_quantile(construction, power), confidence))


@lru_cache(maxsize=64)
def _outcome_table(construction: str, confidence: float) -> tuple[Array, Array]:
    """Limits and outcomes on a grid, to turn one into the other."""
    start = -9.0 if construction in SIGNED else 0.0
    outcomes = np.arange(start, 30.0, 0.005)
    return limit(construction, outcomes, confidence), outcomes


def chance_of_limit(construction: str, size: ArrayLike, confidence: float) -> Array:
    """P(limit < size) without splitting; size over sigma, any shape.

    abs-plus-z: max(0, 2 Phi(s - z) - 1); feldman-cousins-bounded for s >= z: Phi(s - z).
    """
    s = np.asarray(size, dtype=float)
    if construction == "abs-plus-z":
        return np.maximum(0.0, 2.0 * special.ndtr(s - two_sided_z(confidence)) - 1.0)
    limits, outcomes = _outcome_table(construction, float(confidence))
    outcome = np.interp(s, limits, outcomes, left=-np.inf, right=np.inf)
    outcome = np.where(s > limits[-1], outcomes[-1] + (s - limits[-1]), outcome)
    if construction in SIGNED:
        return np.asarray(special.ndtr(outcome))
    return np.maximum(0.0, 2.0 * special.ndtr(outcome) - 1.0)
