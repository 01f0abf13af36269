"""Thresholds in sigma, their p-values, and what trials and looks do to them."""

from __future__ import annotations

from functools import lru_cache

import numpy as np
from scipy import special

from pvfeas.laws import Array


def p_value(significance: float, sides: int) -> float:
    """False-claim probability of a threshold: sides × Phi(-k)."""
    return float(sides * special.ndtr(-significance))


def threshold_for(p: float, sides: int) -> float:
    """The threshold in sigma with a given false-claim probability: -Phi^-1(p/sides)."""
    return float(-special.ndtri(p / sides))


def local_p(p: float, trials: int) -> float:
    """False-claim probability allowed in each of independent trials: 1 - (1 - p)^(1/trials) (Sidak 1967; from memory)."""
    return float(-np.expm1(np.log1p(-p) / trials))


def effective_threshold(significance: float, sides: int = 2, trials: int = 1, looks: int = 1) -> float:
    """The threshold raised so that all trials and looks together keep the false-claim probability.

    Trials first, then looks: equal instalments after each of which a claim may be made, with
    one constant boundary. The chance is planned with the raised threshold at the last look, which
    leaves out the claims made earlier: conservative.
    """
    k = significance
    if trials > 1:
        k = threshold_for(local_p(p_value(k, sides), trials), sides)
    return constant_boundary(k, sides, looks) if looks > 1 else k


@lru_cache(maxsize=64)
def constant_boundary(significance: float, sides: int, looks: int) -> float:
    """The boundary in sigma, the same at every look, that keeps the false-claim probability of one look.

    Solves crossing(c) = sides × Phi(-k) by the secant rule in ln p (repeated significance tests of
    Armitage, McPherson & Rowe 1969, J. R. Stat. Soc. A 132, 235; from memory).
    """
    wanted = np.log(p_value(significance, sides))
    low, high = significance, significance + 0.5
    miss_low = np.log(crossing(low, sides, looks)) - wanted
    miss_high = np.log(crossing(high, sides, looks)) - wanted
    for _ in range(30):
        step = high - miss_high * (high - low) / (miss_high - miss_low)
        low, miss_low = high, miss_high
        high, miss_high = step, np.log(crossing(step, sides, looks)) - wanted
        if abs(miss_high) < 1e-10:
            break
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
            leaves = leaves + special.ndtr(-nodes - edge)
        total += _folded(weights * density * leaves, sides)
        target, next_weights = _inside(boundary, sides, look)
        density = _carried(target, nodes, weights * density, sides)
        nodes, weights = target, next_weights
    return float(total)


def _folded(terms: Array, sides: int) -> float:
    return float(terms.sum() * (2.0 if sides == 2 else 1.0))


def _carried(target: Array, nodes: Array, mass: Array, sides: int) -> Array:
    """The density after one more unit normal step; two-sided densities are even and kept on one half."""
    kernel = np.exp(-0.5 * (target[:, None] - nodes[None, :]) ** 2)
    if sides == 2:
        kernel = kernel + np.exp(-0.5 * (target[:, None] + nodes[None, :]) ** 2)
    return np.asarray((kernel * mass[None, :]).sum(axis=1) / np.sqrt(2.0 * np.pi))


def _inside(boundary: float, sides: int, look: int) -> tuple[Array, Array]:
    """Nodes and weights between the boundaries of a look (half of it, or down to -9 sqrt(look))."""
    edge = boundary * np.sqrt(look)
    low = 0.0 if sides == 2 else -9.0 * np.sqrt(look)
    unit_nodes, unit_weights = _legendre(12 * (2 + int((edge - low) / 8.0)))
    half = (edge - low) / 2.0
    return low + half * (unit_nodes + 1.0), half * unit_weights


@lru_cache(maxsize=128)
def _legendre(count: int) -> tuple[Array, Array]:
    nodes, weights = np.polynomial.legendre.leggauss(count)
    return np.asarray(nodes), np.asarray(weights)
