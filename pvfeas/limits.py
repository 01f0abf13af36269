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

from pvfeas.errors import UsageError
from pvfeas.laws import Array

SIGNED = ("feldman-cousins-bounded", "cls")
UNSIGNED = ("abs-plus-z", "feldman-cousins-abs", "flat-prior-abs")
HALVINGS = 60  # of an interval of a few tens: 1e-17
LEAST_ON_SIZE = 0.7  # confidence of an interval on |x|
FAR = 8.0  # |x| from which the likelihood of |x| knows its sign


def one_sided_z(confidence: ArrayLike) -> Array:
    """z with Phi(z) = confidence."""
    return np.asarray(special.ndtri(np.asarray(confidence, dtype=float)))


def two_sided_z(confidence: ArrayLike) -> Array:
    """z with 2 Phi(z) - 1 = confidence."""
    return np.asarray(-special.ndtri((1.0 - np.asarray(confidence)) / 2.0))


def root_of(rises: Callable[[Array], Array], low: ArrayLike, high: ArrayLike) -> Array:
    """Where a rising function becomes positive between low and high, element by element, by bisection."""
    low, high = np.broadcast_arrays(np.asarray(low, dtype=float), np.asarray(high, dtype=float))
    for _ in range(HALVINGS):
        middle = (low + high) / 2.0
        positive = rises(middle) > 0
        low, high = np.where(positive, low, middle), np.where(positive, middle, high)
    return np.asarray((low + high) / 2.0)


def abs_plus_z(x: ArrayLike, confidence: float) -> Array:
    """L = |x| + z with z two-sided at the confidence: covers whatever the sign, never below z.

    Common practice for null results; for a mean bounded at 0 it is the Feldman–Cousins upper end for x >= 0.
    """
    return np.asarray(np.abs(x) + two_sided_z(confidence))


def cls(x: ArrayLike, confidence: float) -> Array:
    """L = x + Phi^-1(1 - alpha Phi(x)), alpha = 1 - confidence (Cowan et al. 2011, Eur. Phys. J. C 71, 1554).

    For a splitting of predicted sign; also the flat-prior upper limit on a mean bounded at 0.
    """
    value = np.asarray(x, dtype=float)
    return np.asarray(value - special.ndtri_exp(np.log1p(-confidence) + special.log_ndtr(value)))


def flat_prior_abs(x: ArrayLike, confidence: float) -> Array:
    """Posterior quantile of |d| for a flat prior on d and a normal outcome; interpolated, to 1e-7.

    Phi(L - |x|) - Phi(-L - |x|) = confidence (Bayes; derived). Flat in d is flat in |d| with the
    folded likelihood.
    """
    size = np.abs(np.asarray(x, dtype=float))
    grid, limits = _flat_prior_table(float(confidence))
    return np.asarray(np.where(size < grid[-1], np.interp(size, grid, limits), size + one_sided_z(confidence)))


@lru_cache(maxsize=16)
def _flat_prior_table(confidence: float) -> tuple[Array, Array]:
    grid = np.linspace(0.0, FAR, 10001)
    return grid, flat_prior_limit(grid, confidence)


def flat_prior_limit(size: Array, confidence: float) -> Array:
    """The limit of flat_prior_abs by root finding."""

    def over(limit: Array) -> Array:
        return np.asarray(special.ndtr(limit - size) - special.ndtr(-limit - size) - confidence)

    return root_of(over, np.zeros_like(size), size + two_sided_z(confidence) + 1.0)


def feldman_cousins_interval(x: ArrayLike, confidence: float) -> tuple[Array, Array]:
    """Unified interval for the mean of a normal outcome with unit sigma, mean >= 0.

    Feldman & Cousins 1998, Phys. Rev. D 57, 3873, Table X. The acceptance interval [x1, x2] of a mean m
    has equal likelihood ratios at its ends: x1 = 2 m - x2 if that is positive, else
    x1 = m/2 - (x2 - m)^2/(2 m); the interval is the set of m that accept x. For x >= 0 its upper end
    is x + z.
    """
    value = np.asarray(x, dtype=float)
    z = two_sided_z(confidence)
    size, below = np.maximum(value, 0.0), np.minimum(value, 0.0)

    def upper_misses(mean: Array) -> Array:  # x is x1 < 0, hence x2 - m = sqrt(m^2 - 2 m x)
        return np.asarray(special.ndtr(np.sqrt(mean * (mean - 2.0 * below))) - special.ndtr(below - mean) - confidence)

    def lower_misses(mean: Array) -> Array:  # x is x2
        return np.asarray(confidence - special.ndtr(size - mean) + special.ndtr(partner(size, mean) - mean))

    upper = np.where(value >= 0.0, size + z, root_of(upper_misses, np.zeros_like(value), z))
    touches = special.ndtr(size) <= confidence
    lower = np.where(touches, 0.0, root_of(lower_misses, np.zeros_like(value), size))
    return lower, upper


def partner(x2: Array, mean: Array) -> Array:
    """The outcome below x2 >= mean with the same likelihood ratio (Feldman & Cousins 1998, eq. 4.3)."""
    mirrored = 2.0 * mean - x2
    with np.errstate(over="ignore", divide="ignore", invalid="ignore"):
        below_zero = mean / 2.0 - (x2 - mean) ** 2 / (2.0 * mean)
    return np.asarray(np.where(mirrored >= 0.0, mirrored, below_zero))


@lru_cache(maxsize=16)
def _acceptance_table(confidence: float) -> tuple[Array, Array]:
    """Lower ends x1 < 0 of the acceptance intervals, and their means, from 0.001 to z."""
    z = two_sided_z(confidence)
    mean = np.geomspace(0.001 * z, z, 40001)

    def over(x2: Array) -> Array:
        return np.asarray(special.ndtr(x2 - mean) - special.ndtr(partner(x2, mean) - mean) - confidence)

    x1 = partner(root_of(over, mean, mean + z), mean)
    x1[-1] = 0.0  # there the interval is m -/+ z
    return x1, mean


def lowest_accepted(mean: ArrayLike, confidence: float) -> Array:
    """Lower end x1 of the acceptance interval of a mean: m - z from z on, interpolated to 1e-6 below."""
    value, z = np.asarray(mean, dtype=float), two_sided_z(confidence)
    x1, means = _acceptance_table(float(confidence))
    near = np.interp(value, means, x1, left=-np.inf)
    return np.asarray(np.where(value >= z, value - z, near))


def feldman_cousins_bounded(x: ArrayLike, confidence: float) -> Array:
    """Upper end of the unified interval for a mean bounded at 0 (sign predicted); interpolated to 1e-7 for x < 0."""
    value = np.asarray(x, dtype=float)
    x1, means = _acceptance_table(float(confidence))
    return np.asarray(np.where(value >= 0.0, value + two_sided_z(confidence), np.interp(value, x1, means)))


def feldman_cousins_abs(x: ArrayLike, confidence: float) -> Array:
    """Upper end of the likelihood-ratio ordered interval on |x| for |d| >= 0; interpolated, to 1e-6.

    Ordering of Feldman & Cousins 1998 applied to the folded normal outcome |x|: this is another
    construction than their Table X. Raises UsageError for a confidence below 0.7: from 0.6827 down
    the intervals of small outcomes are empty.
    """
    if confidence < LEAST_ON_SIZE:
        raise UsageError(f"feldman-cousins-abs has empty intervals at confidence {confidence:g}; it needs 0.7 or more")
    size = np.abs(np.asarray(x, dtype=float))
    grid, limits = _on_size_table(float(confidence))
    return np.asarray(np.where(size < FAR, np.interp(size, grid, limits), size + two_sided_z(confidence)))


@lru_cache(maxsize=16)
def _on_size_table(confidence: float) -> tuple[Array, Array]:
    grid = np.linspace(0.0, FAR, 32001)
    return grid, feldman_cousins_abs_limit(grid, confidence)


def feldman_cousins_abs_limit(size: Array, confidence: float) -> Array:
    """The limit of feldman_cousins_abs: the mean m whose acceptance interval of |x| begins at size.

    Newton's rule for m and the interval's other end y: equal likelihood ratios at both ends and
    the wanted probability between them. Raises ArithmeticError where it does not converge.
    """
    z = two_sided_z(confidence)
    mean, end = size + z, size + 2.0 * z
    for _ in range(100):
        level, slope_here, _ = _log_ratio(size, mean)
        there, slope_there, slope_end = _log_ratio(end, mean)
        miss_level, miss_share = there - level, (1.0 - confidence) - _outside(size, end, mean)
        d_mean = slope_there - slope_here
        share_end = _normal(end - mean) + _normal(end + mean)
        share_mean = _normal(size - mean) - _normal(size + mean) - _normal(end - mean) + _normal(end + mean)
        determinant = d_mean * share_end - slope_end * share_mean
        step_mean = (miss_level * share_end - slope_end * miss_share) / determinant
        step_end = (d_mean * miss_share - share_mean * miss_level) / determinant
        mean = np.maximum(mean - np.clip(step_mean, -0.3, 0.3), 0.5 * mean)
        end = np.maximum(end - np.clip(step_end, -0.3, 0.3), mean)
        if np.max(np.abs(step_mean)) < 1e-12:
            return np.asarray(mean)
    raise ArithmeticError("the interval on |x| was not found")


def _normal(x: Array) -> Array:
    return np.asarray(np.exp(-0.5 * x**2) / np.sqrt(2.0 * np.pi))


def _outside(low: Array, high: Array, mean: Array) -> Array:
    """P(|x| < low or |x| > high)."""
    below = special.ndtr(low - mean) - special.ndtr(-low - mean)
    return np.asarray(below + special.ndtr(mean - high) + special.ndtr(-high - mean))


def _log_ratio(y: Array, mean: Array) -> tuple[Array, Array, Array]:
    """Logarithm of the likelihood ratio of |x| = y, and its derivatives with respect to the mean and to y."""
    best = _best_mean(y)
    value = _log_likelihood(y, mean) - _log_likelihood(y, best)
    return value, y * np.tanh(mean * y) - mean, mean * np.tanh(mean * y) - best * np.tanh(best * y)


def _log_likelihood(y: Array, mean: Array) -> Array:
    """Logarithm of the folded normal density up to a constant: -(y - m)^2/2 + ln(1 + exp(-2 m y))."""
    return np.asarray(-0.5 * (y - mean) ** 2 + np.log1p(np.exp(-2.0 * mean * y)))


def _best_mean(y: Array) -> Array:
    """The mean of greatest likelihood of |x| = y: m = y tanh(m y), zero up to y = 1.

    With p = m y it is y^2 = p/tanh p; p^2 against y^2 is smooth and is interpolated (errors of the
    best mean act on the likelihood in second order only).
    """
    p = np.arange(1e-3, 25.0, 1e-3)
    square = np.interp(y**2, np.concatenate([[1.0], p / np.tanh(p)]), np.concatenate([[0.0], p**2]), left=0.0)
    return np.asarray(np.where(y > 5.0 - 1e-9, y, np.sqrt(square) / np.maximum(y, 1.0)))


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
    start = -12.0 if construction in SIGNED else 0.0
    outcomes = np.linspace(start, 30.0, 1 + round((30.0 - start) / 0.002))
    return limit(construction, outcomes, confidence), outcomes


def chance_of_limit(construction: str, size: ArrayLike, confidence: float) -> Array:
    """P(limit < size) without splitting; size over sigma, any shape.

    abs-plus-z: max(0, 2 Phi(s - z) - 1); feldman-cousins-bounded: Phi(x1(s)), which is Phi(s - z) from z on.
    """
    s = np.asarray(size, dtype=float)
    if construction == "abs-plus-z":
        return np.maximum(0.0, 2.0 * special.ndtr(s - two_sided_z(confidence)) - 1.0)
    if construction == "feldman-cousins-bounded":
        return np.asarray(special.ndtr(lowest_accepted(s, confidence)))
    limits, outcomes = _outcome_table(construction, float(confidence))
    outcome = np.interp(s, limits, outcomes, left=-np.inf, right=np.inf)
    below = special.ndtr(outcome)
    return np.asarray(below if construction in SIGNED else np.maximum(0.0, 2.0 * below - 1.0))
