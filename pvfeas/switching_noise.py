"""Frequency noise of the reference seen through a switching pattern: the variance of A minus B.

Long runs: variance = (1/t) [Σ_{m>=1} |g_m|^2 S(m/period) + 2 pi^2 h-2 b^2], g_m the Fourier coefficients of the
weight g, t the elapsed pattern time, b the drift bias (derived; checked in the tests by direct integration and
simulation). With g piecewise constant the sums are closed: g_m = Σ_k c_k exp(-2 pi i m x_k)/(2 pi i m) over its jumps
c_k at x_k, hence |g_m|^2 is a sum of cosines over m^2, and Σ cos(2 pi m x)/m^s is a Bernoulli polynomial for
s = 2 and 4 and the Clausen-type function C3 for s = 3.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from scipy import special

from pvfeas.laws import Array
from pvfeas.patterns import Timing, drift_bias, jumps

ZETA3 = 1.2020569031595942  # Apery's constant
TERMS = 26  # of the series of C3: (1/2)^(2 × 26) = 2e-16 at the worst angle


def cosine_sum_2(share: Array) -> Array:
    """Σ_{m>=1} cos(2 pi m x)/m^2 = pi^2 B2(x), x in periods (Abramowitz & Stegun 1964, 23.1.18; from memory)."""
    x = np.asarray(share) % 1.0
    return np.asarray(np.pi**2 * (x * x - x + 1.0 / 6.0))


def cosine_sum_4(share: Array) -> Array:
    """Σ_{m>=1} cos(2 pi m x)/m^4 = -(pi^4/3) B4(x), x in periods (Abramowitz & Stegun 1964, 23.1.18; from memory)."""
    x = np.asarray(share) % 1.0
    return np.asarray(-(np.pi**4) / 3.0 * (x**4 - 2.0 * x**3 + x * x - 1.0 / 30.0))


_ORDERS = np.arange(1, TERMS + 1)
_BERNOULLI = np.abs(special.bernoulli(2 * TERMS)[2::2])
_SERIES = _BERNOULLI / (2.0 * _ORDERS * special.factorial(2 * _ORDERS + 2))


def cosine_sum_3(share: Array) -> Array:
    """Σ_{m>=1} cos(2 pi m x)/m^3 for x in periods.

    With theta = 2 pi x in [0, pi]: zeta(3) + (theta^2/2) ln theta - (3/4) theta^2
    - Σ_k |B_2k| theta^(2k+2)/(2k (2k+2)!), from integrating
    ln(2 sin(theta/2)) twice (derived; Lewin 1981, Polylogarithms, ch. 6, from memory).
    """
    x = np.asarray(share, dtype=float) % 1.0
    theta = 2.0 * np.pi * np.minimum(x, 1.0 - x)
    square = theta * theta
    total = np.zeros_like(theta)
    for coefficient in _SERIES[::-1]:
        total = (total + coefficient) * square
    with np.errstate(divide="ignore", invalid="ignore"):
        logarithm = np.where(theta > 0, np.log(theta), 0.0)
    return np.asarray(ZETA3 + square * (0.5 * logarithm - 0.75 - total))


def _pairs(places: Array, sizes: Array, function: Callable[[Array], Array]) -> Array:
    """Σ_kl c_k c_l function(x_k - x_l); function is even."""
    total = function(np.zeros(())) * (sizes * sizes).sum(axis=0)
    for k in range(len(places)):
        for other in range(k):
            total = total + 2.0 * sizes[k] * sizes[other] * function(places[k] - places[other])
    return np.asarray(total)


@dataclass(frozen=True)
class Passed:
    """Variance × elapsed pattern time of A minus B, per unit of h0, h-1 and h-2; and the drift bias in s."""

    white: Array
    flicker: Array  # s
    random_walk: Array  # s^2
    bias: Array

    def total(self, white: Array, flicker: Array, random_walk: Array) -> Array:
        """Hz^2 s for given levels of noise."""
        return np.asarray(self.white * white + self.flicker * flicker + self.random_walk * random_walk)


def long_run(found: Timing) -> Passed:
    """The long-run sums of a pattern; cost: half the square of twice the letters, times the draws of its timing."""
    places, sizes = jumps(found)
    period, bias = found.period, drift_bias(found)
    quarter = 1.0 / (4.0 * np.pi**2)
    return Passed(
        white=quarter * _pairs(places, sizes, cosine_sum_2),
        flicker=period * quarter * _pairs(places, sizes, cosine_sum_3),
        random_walk=period**2 * quarter * _pairs(places, sizes, cosine_sum_4) + 2.0 * np.pi**2 * bias**2,
        bias=bias,
    )


def _phase_flicker(time: Array) -> Array:
    """Generalised covariance of the phase of flicker noise over h-1: t^2 ln|t|/2."""
    size = np.abs(time)
    with np.errstate(divide="ignore", invalid="ignore"):
        return np.asarray(np.where(size > 0, 0.5 * size**2 * np.log(size), 0.0))


def flicker_runs(found: Timing, most: int) -> Array:
    """What runs of exactly 1, 2, …, most patterns add to the long-run flicker sum, s: (most, …).

    Over N patterns variance × time = period [A_0 + 2 Σ_{n<N} (1 - n/N) A_n],
    A_n = Σ_kl c_k c_l K(x_k - x_l + n) with the generalised covariance K = x^2 ln|x|/2 of the phase (Chiles & Delfiner
    1999, Geostatistics, ch. 4, from memory; derived here). White and random-walk noise need nothing: their long-run
    sums hold for every run. Cost: the square of twice the letters, times most, times the draws of the timing.
    """
    places, sizes = jumps(found)
    lags = np.stack([_lag_sum(places, sizes, number) for number in range(most)])
    number = np.arange(most).reshape((-1,) + (1,) * (lags.ndim - 1))
    later = np.where(number > 0, 2.0 * lags, 0.0)
    before, moments = np.cumsum(later, axis=0), np.cumsum(number * later, axis=0)
    runs = found.period * (lags[0] + before - moments / (number + 1.0))
    return np.asarray(runs - long_run(found).flicker)


def _lag_sum(places: Array, sizes: Array, number: int) -> Array:
    """Σ_kl c_k c_l K(x_k - x_l + number) for flicker noise, times in periods."""
    total: Array = np.zeros(())
    for k in range(len(places)):
        for other in range(len(places)):
            total = total + sizes[k] * sizes[other] * _phase_flicker(places[k] - places[other] + number)
    return total


def aliased_uniform(fraction: Array, cycle_time: Array, white: Array, flicker: Array, random_walk: Array) -> Array:
    """Σ_{k>=1} |s_k|^2 S(k/cycle) in Hz^2/Hz for a cycle that looks evenly during a fraction of its time.

    s_k = sin(pi k r)/(pi k r): white (1/r - 1)/2, flicker and random walk through C3 and B4 (the effect of Dick 1987,
    Proc. 19th PTTI, 133, from memory; the sums derived). fraction r in (0, 1], cycle_time in s; h as in
    frequency_noise.
    """
    r = np.asarray(fraction)
    scale = 1.0 / (2.0 * np.pi**2 * r**2)
    return np.asarray(
        white * (1.0 / r - 1.0) / 2.0
        + flicker * cycle_time * scale * (ZETA3 - cosine_sum_3(r))
        + random_walk * cycle_time**2 * scale * (np.pi**4 / 90.0 - cosine_sum_4(r))
    )


def aliased_shape(shape: Array, cycle_time: Array, white: Array, flicker: Array, random_walk: Array) -> Array:
    """Σ_{k>=1} |s_k|^2 S(k/cycle) in Hz^2/Hz for a sensitivity sampled in equal bins of a cycle (last axis).

    The shape is normalised to mean 1; white noise by Parseval, the rest by the Fourier series up to half the bins.
    """
    weight = shape / shape.mean(axis=-1, keepdims=True)
    series = np.abs(np.fft.rfft(weight, axis=-1)[..., 1:] / weight.shape[-1]) ** 2
    order = np.arange(1, series.shape[-1] + 1)
    mean_square = (weight * weight).mean(axis=-1)
    return np.asarray(
        white * (mean_square - 1.0) / 2.0
        + flicker * cycle_time * (series / order).sum(axis=-1)
        + random_walk * cycle_time**2 * (series / order**2).sum(axis=-1)
    )
