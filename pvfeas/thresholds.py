"""Thresholds in sigma, their p-values, and what trials and looks do to them."""

from __future__ import annotations

from functools import lru_cache

import numpy as np
from numpy.typing import ArrayLike
from scipy import special

from pvfeas.laws import Array

LOWEST = 6.5  # sigma of the running sum below which a one-sided claim later on is ignored: 4e-11
SURE = 10.0  # sigma above which looks are counted as if independent, p being below 2e-23


def p_value(significance: float, sides: int) -> float:
    """False-claim probability of a threshold: sides × Phi(-k)."""
    return float(sides * special.ndtr(-significance))


def threshold_for(p: float, sides: int) -> float:
    """The threshold in sigma with a given false-claim probability: -Phi^-1(p/sides)."""
    return float(-special.ndtri(p / sides))


def sigma_of_log_tail(log_tail: ArrayLike) -> Array:
    """k with ln Phi(-k) = log_tail, also where the probability itself is below the smallest float."""
    return np.asarray(-special.ndtri_exp(np.asarray(log_tail, dtype=float)))


def local_p(p: float, trials: int) -> float:
    """False-claim probability left to each of independent trials: 1 - (1 - p)^(1/trials).

    Sidak 1967, J. Am. Stat. Assoc. 62, 626 (from memory).
    """
    return float(-np.expm1(np.log1p(-p) / trials))


def effective_threshold(significance: float, sides: int = 2, trials: int = 1, looks: int = 1) -> float:
    """The threshold raised so that all trials and looks together keep the false-claim probability.

    Trials first, then looks: equal instalments after each of which a claim may be made, with
    one constant boundary. The chance is planned with the raised threshold at the last look, which
    leaves out the claims made earlier: conservative.
    """
    k = significance if trials == 1 else _raised_for_trials(significance, sides, trials)
    return k if looks == 1 else constant_boundary(float(k), sides, looks)


def _raised_for_trials(significance: float, sides: int, trials: int) -> float:
    log_p = float(np.log(sides) + special.log_ndtr(-significance))
    log_local = np.log(local_p(np.exp(log_p), trials)) if log_p > -600.0 else log_p - np.log(trials)
    return float(sigma_of_log_tail(log_local - np.log(sides)))


@lru_cache(maxsize=256)
def constant_boundary(significance: float, sides: int, looks: int) -> float:
    """The boundary in sigma, the same at every look, that keeps the false-claim probability of one look.

    Solves crossing(c) = sides × Phi(-k) by the secant rule, probabilities written in sigma (repeated
    significance tests of Armitage, McPherson & Rowe 1969, J. R. Stat. Soc. A 132, 235; from memory).
    Above 10 sigma the looks count as if independent, which is never too low.
    """
    alone = float(special.log_ndtr(-significance))
    if significance > SURE:
        return float(sigma_of_log_tail(alone - np.log(looks)))

    def worth(boundary: float) -> float:
        return threshold_for(min(crossing(boundary, sides, looks), sides * (1.0 - 1e-15)), sides)

    low = float(sigma_of_log_tail(alone - np.log(min(looks, 1.0 + 5.0 * np.log(looks)))))
    at_low = worth(low)
    high = low + significance - at_low
    for _ in range(40):
        at_high = worth(high)
        if abs(at_high - significance) < 1e-11 or at_high == at_low:
            break
        step = (significance - at_high) * (high - low) / (at_high - at_low)
        low, at_low, high = high, at_high, high + step
    return float(high)


def crossing(boundary: float, sides: int, looks: int) -> float:
    """Probability without signal that the running sum crosses the boundary at any of the looks.

    The density of the running sum of unit normal steps inside the boundary is carried from look
    to look by Gauss–Legendre quadrature; what leaves it is summed, so that small probabilities keep
    their digits.
    """
    total = p_value(boundary, sides)
    nodes, weights = _inside(boundary, sides, 1)
    density = np.exp(-0.5 * nodes**2) / np.sqrt(2.0 * np.pi)
    for look in range(2, looks + 1):
        edge = boundary * np.sqrt(look)
        leaves = special.ndtr(nodes - edge)
        if sides == 2:
            leaves = 2.0 * (leaves + special.ndtr(-nodes - edge))  # the half kept stands for both
        total += float((weights * density * leaves).sum())
        target, next_weights = _inside(boundary, sides, look)
        density = _carried(target, nodes, weights * density, sides, 9.0 + boundary / np.sqrt(look))
        nodes, weights = target, next_weights
    return total


def _carried(target: Array, nodes: Array, mass: Array, sides: int, reach: float) -> Array:
    """The density after one more unit normal step; steps beyond reach are left out.

    Two-sided densities are even and kept on one half.
    """
    if sides == 2:
        nodes, mass = np.concatenate([-nodes[::-1], nodes]), np.concatenate([mass[::-1], mass])
    start = np.searchsorted(nodes, target - reach)
    width = int(np.max(np.searchsorted(nodes, target + reach) - start))
    near = np.minimum(start, len(nodes) - width)[:, None] + np.arange(width)
    kernel = np.exp(-0.5 * (target[:, None] - nodes[near]) ** 2)
    return np.asarray((kernel * mass[near]).sum(axis=1) / np.sqrt(2.0 * np.pi))


def _inside(boundary: float, sides: int, look: int) -> tuple[Array, Array]:
    """Nodes and weights between the boundaries of a look: the upper half of it, or all that matters."""
    edge = boundary * np.sqrt(look)
    low = 0.0 if sides == 2 else -LOWEST * np.sqrt(look)
    unit_nodes, unit_weights = _legendre(12 * (2 + int((edge - low) / 8.0)))
    half = (edge - low) / 2.0
    return low + half * (unit_nodes + 1.0), half * unit_weights


@lru_cache(maxsize=256)
def _legendre(count: int) -> tuple[Array, Array]:
    nodes, weights = np.polynomial.legendre.leggauss(count)
    return np.asarray(nodes), np.asarray(weights)
