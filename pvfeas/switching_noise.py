"""Frequency noise of the reference seen through a switching pattern: the variance of A minus B.

Long runs: variance = (1/t) [Σ_{m>=1} |g_m|^2 S(m/period) + 2 pi^2 h-2 b^2], g_m the Fourier coefficients of the
weight g, t the elapsed pattern time, b the drift bias (derived; checked in the tests by these sums, by direct
integration and by simulation). g is piecewise constant, so that all of it is closed:
white noise by Parseval; a random walk is the integral of white noise, hence its share that of the square of ∫ g dt;
flicker noise by the generalised covariance K = x^2 ln|x|/2 of its phase (Chiles & Delfiner 1999, Geostatistics,
ch. 4, from memory; derived): over N patterns variance × time = period [A_0 + 2 Σ_{n<N} (1 - n/N) A_n] with
A_n = Σ_kl c_k c_l K(x_k - x_l + n) over the jumps c_k of g at x_k (in periods). The A_n of distant patterns fall as
powers of 1/n that the moments of the jumps give.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from scipy import special

from pvfeas.laws import Array
from pvfeas.patterns import Timing, distances, drift_bias, jumps, levels

ZETA3 = 1.2020569031595942  # Apery's constant
TERMS = 26  # of the series of C3: (1/2)^(2 × 26) = 2e-16 at the worst angle
NEAR = 3  # patterns from here on are distant: |x_k - x_l| < 1, so that the series goes as (1/3)^2
ORDERS = tuple(range(4, 22, 2))  # of the series of distant patterns; the first left out is below 1e-13 of the first


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


def _random_walk(found: Timing) -> Array:
    """Variance × time of a random walk over h-2, s^2: 2 pi^2 times the mean square of W(t) = ∫_0^t g (derived).

    The walk's steps have variance 2 pi^2 h-2 per s, and one at t counts as -W(t). W is straight between jumps, zero
    at both ends: the same for every number of patterns, and 2 pi^2 b^2 is the part of W's mean.
    """
    on_a, on_b = levels(found)
    at = before = total = np.zeros(found.period.shape)
    for letter, begin, end in zip(found.pattern, found.begin, found.end, strict=True):
        length = end - begin
        total = total + at * at * (begin - before)
        after = at + {"A": on_a, "B": on_b}.get(letter, 0.0) * length
        total = total + (at * at + at * after + after * after) * length / 3.0
        at, before = after, end
    return np.asarray(2.0 * np.pi**2 * total / found.period)


def _near(found: Timing) -> list[Array]:
    """A_0, A_1, A_2 of flicker noise; Σ c_k c_l = 0 lets K(n) be taken off, so that equal places count nothing."""
    places, sizes = jumps(found)
    total = [np.zeros(found.period.shape) for _ in range(NEAR)]
    for group in distances(found.pattern):
        first, second, _ = group[0]
        weight = sum((count * sizes[k] * sizes[other] for k, other, count in group), np.zeros(found.period.shape))
        gap = places[first] - places[second]
        total[0] = total[0] + weight * _twice_covariance(gap)
        for number in range(1, NEAR):
            both = _twice_covariance(number + gap) + _twice_covariance(number - gap)
            total[number] = total[number] + weight * (both / 2.0 - number**2 * np.log(number))
    return total


def _twice_covariance(time: Array) -> Array:
    """2 K = x^2 ln|x|, zero at zero."""
    return np.asarray(special.xlogy(time * time, np.abs(time)))


def _distant(found: Timing) -> list[Array]:
    """D_j/(j (j - 1) (j - 2)) for each order j, with D_j = Σ_kl c_k c_l (x_k - x_l)^j; then A_n = -Σ_j of it n^(2 - j).

    D_j = Σ_i (-1)^i (j over i) M_i M_(j-i) from the moments M_i of the jumps about the middle; M_0 = M_1 = 0.
    """
    places, sizes = jumps(found)
    centred, power = places - 0.5, sizes * (places - 0.5)
    moments = {}
    for order in range(2, ORDERS[-1] - 1):
        power = power * centred
        moments[order] = sum(power, np.zeros(found.period.shape))
    series = []
    for order in ORDERS:
        scale = order * (order - 1) * (order - 2)
        terms = (
            float(special.binom(order, i)) / scale * (-1) ** i * moments[i] * moments[order - i]
            for i in range(2, order - 1)
        )
        series.append(sum(terms, np.zeros(found.period.shape)))
    return series


def long_run(found: Timing) -> Passed:
    """The long-run sums of a pattern.

    Cost: what depends on the text only is kept (patterns.distances); a draw then costs 5 logarithms a distance, of
    which AB has 6, ABBA 9 and ABBABAAB 42, and some 40 products a letter: 1 to 5 µs. Memory: some tens of arrays
    of draws.
    """
    on_a, on_b = levels(found)
    near, distant = _near(found), _distant(found)
    flicker = near[0] + 2.0 * sum(near[1:], np.zeros(found.period.shape))
    for order, part in zip(ORDERS, distant, strict=True):
        flicker = flicker - 2.0 * float(special.zeta(order - 2, NEAR)) * part
    return Passed(
        white=np.asarray((on_a - on_b) / 2.0),
        flicker=np.asarray(found.period * flicker),
        random_walk=_random_walk(found),
        bias=drift_bias(found),
    )


@lru_cache(maxsize=8)
def _run_factors(most: int) -> Array:
    """Factors of A_1, A_2 and of the distant orders in what runs of 1, …, most patterns add: (most; A_1, A_2, orders).

    -2 Σ_{n>=N} A_n - (2/N) Σ_{n<N} n A_n.
    """
    runs = np.arange(1, most + 1, dtype=float)
    rows = [np.where(runs <= number, -2.0, -2.0 * number / runs) for number in range(1, NEAR)]
    for order in ORDERS:
        terms = np.where(runs >= NEAR, runs ** (3.0 - order), 0.0)  # n A_n without the order's part
        before = np.concatenate([[0.0], np.cumsum(terms)[:-1]])
        rows.append(2.0 * special.zeta(order - 2, np.maximum(runs, NEAR)) + 2.0 * before / runs)
    return np.stack(rows, axis=1)


def flicker_runs(found: Timing, most: int) -> Array:
    """What runs of exactly 1, 2, …, most patterns add to the long-run flicker sum, s: (most, …).

    White and random-walk noise need nothing: their long-run sums hold for every run. Cost: that of long_run and most
    × 11 products a draw; memory: most × draws.
    """
    parts = [found.period * part for part in (*_near(found)[1:], *_distant(found))]
    total = np.zeros((most, *found.period.shape))
    for number, factors in enumerate(_run_factors(most)):
        row = total[number, ...]  # a view also where there is one draw only
        for factor, part in zip(factors, parts, strict=True):
            row += factor * part
    return total


def aliased_uniform(fraction: Array, cycle_time: Array, white: Array, flicker: Array, random_walk: Array) -> Array:
    """Σ_{k>=1} |s_k|^2 S(k/cycle) in Hz^2/Hz for a cycle that looks evenly during a fraction of its time.

    s_k = sin(pi k r)/(pi k r): white (1/r - 1)/2, flicker and random walk through C3 and B4 (the effect of Dick 1987,
    Proc. 19th PTTI, 133, from memory; the sums derived). fraction r in (0, 1], cycle_time in s; h as in
    frequency_noise. Beside long_run this is exact for white noise; for flicker and random walk it takes the cycles
    for short against the dwell: with r = 1/2 the sum for AB is 19, 2.2 and 0.7 % low with 1, 5 and 10 cycles a dwell.
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


def aliased_part(
    shape: Array, fraction: Array, cycle_time: Array, white: Array, flicker: Array, random_walk: Array
) -> Array:
    """Σ_{k>=1} |s_k|^2 S(k/cycle) in Hz^2/Hz for a cycle that looks during a fraction of its time, however short.

    shape: sensitivity in equal bins of that part (last axis), normalised here; fraction r in (0, 1]. With R the
    autocorrelation of the shape over distances d in units of the part, Σ cos(2 pi k x)/k^s over R(d) at x = r |d|:
    white ((mean square)/r - 1)/2, flicker -ln(2 sin pi x), random walk pi^2 (x^2 - x + 1/6) (Abramowitz & Stegun
    1964, 23.1.18 and 27.8.6, from memory; derived). Steps between bins cost of the order of 1/bins^2.
    """
    bins, r = shape.shape[-1], np.asarray(fraction)
    weight = shape / shape.sum(axis=-1, keepdims=True)
    spectrum = np.abs(np.fft.rfft(weight, 2 * bins, axis=-1)) ** 2
    share = np.fft.irfft(spectrum, axis=-1)[..., :bins] * np.where(np.arange(bins) > 0, 2.0, 1.0)
    distance, square, logarithm = _bin_distances(bins)
    x = r[..., None] * np.arange(bins) / bins
    rounded = np.log(np.sinc(x)) - (np.pi * r[..., None] / bins) ** 2 / 36.0  # mean over the bins: + f''/12
    log_sine = -np.log(2.0 * np.pi * r) - (share * (logarithm + rounded)).sum(axis=-1)
    mean, mean_square = (share * distance).sum(axis=-1), (share * square).sum(axis=-1)
    return np.asarray(
        white * (bins * share[..., 0] / r - 1.0) / 2.0
        + flicker * cycle_time * np.maximum(log_sine, 0.0)
        + random_walk * cycle_time**2 * np.pi**2 * (r * r * mean_square - r * mean + 1.0 / 6.0)
    )


@lru_cache(maxsize=8)
def _bin_distances(bins: int) -> tuple[Array, Array, Array]:
    """Means of |d|, d^2 and ln|d| over two bins that lie 0, 1, … bins apart; d in units of all bins."""
    apart = np.arange(bins, dtype=float)
    distance = np.where(apart > 0, apart, 1.0 / 3.0) / bins
    integral = np.arange(-1, bins + 1, dtype=float)  # of ln|x|, twice: x^2 ln|x|/2 - 3 x^2/4
    integral = 0.5 * special.xlogy(integral**2, np.abs(integral)) - 0.75 * integral**2
    logarithm = integral[2:] - 2.0 * integral[1:-1] + integral[:-2] - np.log(bins)
    return distance, (apart**2 + 1.0 / 6.0) / bins**2, logarithm
