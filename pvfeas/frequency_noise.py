"""Frequency noise of a reference: power spectral densities, Allan deviations, and from one to the other.

S(f) = h0 + h-1/f + h-2/f^2, one-sided, in Hz^2/Hz with f in Hz; h0 in Hz^2/Hz, h-1 in Hz^2, h-2 in Hz^2 Hz.
"""

from __future__ import annotations

import numpy as np

from pvfeas.laws import Array

# Allan variance over h at averaging time tau: h0/(2 tau), 2 ln 2 h-1, (2 pi^2/3) h-2 tau (Riley 2008, NIST SP 1065,
# and IEEE Std 1139; from memory; the integrals are derived in the tests).
FLICKER = 2.0 * np.log(2.0)
RANDOM_WALK = 2.0 * np.pi**2 / 3.0
KINDS = ("white", "flicker", "random-walk")


def allan_variance(white: Array, flicker: Array, random_walk: Array, tau: Array) -> Array:
    """Allan variance in Hz^2 after averaging over tau: h0/(2 tau) + 2 ln 2 h-1 + (2 pi^2/3) h-2 tau.

    white, flicker, random_walk: h0, h-1, h-2; tau in s. Arrays broadcast.
    """
    return np.asarray(white / (2.0 * tau) + FLICKER * flicker + RANDOM_WALK * random_walk * tau)


def level_of_deviation(kind: str, deviation: Array, tau: Array) -> Array:
    """The coefficient of one kind of noise from its Allan deviation (Hz) at tau (s).

    h0 = 2 tau sigma^2, h-1 = sigma^2/(2 ln 2), h-2 = 3 sigma^2/(2 pi^2 tau). Raises KeyError for another kind.
    """
    square = np.square(np.asarray(deviation))
    scale = {"white": 2.0 * tau, "flicker": 1.0 / FLICKER, "random-walk": 1.0 / (RANDOM_WALK * np.asarray(tau))}
    return np.asarray(square * scale[kind])


def levels_of_table(tau: Array, deviation: Array) -> tuple[float, float, float]:
    """h0, h-1, h-2 that fit Allan deviations, by non-negative least squares of the relative Allan variance.

    tau in s and deviation in Hz: one-dimensional, of equal length and positive. Raises ValueError otherwise.
    """
    from scipy.optimize import nnls

    times, variance = np.asarray(tau, dtype=float), np.square(np.asarray(deviation, dtype=float))
    if times.ndim != 1 or times.shape != variance.shape or times.size == 0:
        raise ValueError("a table of Allan deviations has one deviation for each tau")
    if not (np.all(times > 0) and np.all(variance > 0)):
        raise ValueError("the times and deviations of a table are positive")
    columns = np.stack([0.5 / times, np.full_like(times, FLICKER), RANDOM_WALK * times], axis=1)
    size = columns.max(axis=0)
    found, _ = nnls(columns / size / variance[:, None], np.ones_like(times))
    white, flicker, random_walk = found / size
    return float(white), float(flicker), float(random_walk)
