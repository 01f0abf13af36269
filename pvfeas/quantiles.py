"""Quantiles of a quantity whose distribution function can be computed exactly at any value.

Everything is done on x = ln(value), so the quantity must be positive.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np
from scipy import special

from pvfeas.laws import Array
from pvfeas.points import half_width

LOWEST, HIGHEST = -80.0, 140.0  # of ln(value): 1e-35 to 1e61 in any unit of this trade
ACCURACY = 1e-9  # of P
CLOSE = 0.01  # a root is close enough at this share of the error that the replicates show
Distribution = Callable[[Array], Array]  # values (k,) -> P(quantity <= value), (k, replicates)


@dataclass(frozen=True)
class Quantile:
    """One quantile; value is None where the distribution never gets there. error: 95 % half-width."""

    value: float | None
    error: float | None


def solve(
    distribution: Distribution, probabilities: Sequence[float], starts: Sequence[float], spread: float = 0.0
) -> list[Quantile]:
    """Quantiles of the pooled distribution and their errors from the spread of the replicates.

    starts: first guesses of the quantiles, any positive values; spread: a guess of the standard deviation of
    ln x, 0 where there is none. Bracketed secant steps in ln x on P - p, all quantiles at once; the error of
    ln x is that of P at the quantile over the density there.
    """
    wanted = np.asarray(probabilities, dtype=float)
    reachable = distribution(np.array([np.exp(HIGHEST)]))[0]
    ceiling, slack = float(reachable.mean()), float(half_width(reachable))
    inside = (wanted <= ceiling - slack) & ((wanted < ceiling) | (ceiling >= 1.0))
    found = [Quantile(None, None)] * len(wanted)
    if not np.any(inside):
        return found
    guesses = np.log(np.asarray(starts, dtype=float)[inside]).clip(LOWEST + 1.0, HIGHEST - 1.0)
    x, density, replicates = _roots(distribution, wanted[inside], guesses, spread)
    errors = half_width(replicates)
    for i, place in enumerate(np.nonzero(inside)[0]):
        value = float(np.exp(x[i]))
        found[place] = Quantile(value, float(value * errors[i] / density[i]) if density[i] > 0 else 0.0)
    return found


def _roots(distribution: Distribution, wanted: Array, x: Array, spread: float) -> tuple[Array, Array, Array]:
    """ln x with P = wanted, the density there, and P of every replicate there."""
    low, high = np.full_like(x, LOWEST), np.full_like(x, HIGHEST)
    step = 0.02
    density = (
        np.exp(-0.5 * special.ndtri(wanted) ** 2) / (spread * np.sqrt(2.0 * np.pi)) if spread > 0 else np.zeros_like(x)
    )
    told = np.zeros(x.shape, dtype=bool)  # whether the density is more than a guess
    replicates = distribution(np.exp(x))
    pooled = replicates.mean(axis=-1)
    for _ in range(120):
        miss = pooled - wanted
        low, high = np.where(miss < 0, x, low), np.where(miss < 0, high, x)
        settled = (np.abs(miss) < np.maximum(ACCURACY, CLOSE * half_width(replicates))) & told & (density > 0)
        if np.all(settled | (high - low < 1e-12 * np.maximum(1.0, np.abs(x)))):
            break
        proposal = np.where(settled, x, _next(x, miss, density, step, low, high))
        new = distribution(np.exp(proposal))
        new_pooled = new.mean(axis=-1)
        with np.errstate(divide="ignore", invalid="ignore", over="ignore"):
            slope = (new_pooled - pooled) / (proposal - x)
        moved = proposal != x
        density = np.where(moved & (slope > 0), slope, np.where(moved, 0.0, density))
        told = told | moved
        x, pooled, replicates = proposal, new_pooled, new
        step = min(2.0 * step, 4.0)
    return x, density, replicates


def _next(x: Array, miss: Array, density: Array, step: float, low: Array, high: Array) -> Array:
    """The secant step where it stays inside the bracket, else its middle, else a step towards the root."""
    with np.errstate(divide="ignore", invalid="ignore", over="ignore"):
        change = np.where(density > 0, -miss / density, -np.sign(miss) * step)
    change = np.where(np.abs(change) < 1e-9, np.where(miss > 0, -1e-9, 1e-9), change).clip(-4.0, 4.0)
    wanted = x + change
    known = (low > LOWEST) & (high < HIGHEST)
    middle = np.where(known, (low + high) / 2.0, x - np.sign(miss) * step)
    inside = (wanted > low) & (wanted < high)
    return np.asarray(np.where(inside, wanted, middle).clip(low, high))


def of_values(values: Array, weights: Array, probabilities: Sequence[float]) -> tuple[list[float], list[float]]:
    """Quantiles of weighted draws and 95 % half-widths from the replicates.

    values, weights: (draws, replicates); the quantile is the inverted distribution function,
    infinities allowed.
    """
    pooled = _inverted(values.ravel(), weights.ravel(), probabilities)
    single = np.array([_inverted(values[:, r], weights[:, r], probabilities) for r in range(values.shape[1])])
    errors = [
        float(half_width(single[:, i])) if np.all(np.isfinite(single[:, i])) else np.inf for i in range(len(pooled))
    ]
    return pooled, errors


def pooled(values: Array, weights: Array, probabilities: Sequence[float]) -> list[float]:
    """Quantiles of weighted draws of any shape, without errors."""
    return _inverted(values.ravel(), weights.ravel(), probabilities)


def _inverted(values: Array, weights: Array, probabilities: Sequence[float]) -> list[float]:
    """Quantiles interpolated between the mid-points of the sorted draws' weights."""
    order = np.argsort(values, kind="stable")
    ordered, weight = values[order], weights[order]
    cumulated = (np.cumsum(weight) - weight / 2.0) / weight.sum()
    place = np.searchsorted(cumulated, probabilities).clip(1, len(ordered) - 1)
    low, high = ordered[place - 1], ordered[place]
    with np.errstate(invalid="ignore", divide="ignore"):
        share = (np.asarray(probabilities) - cumulated[place - 1]) / (cumulated[place] - cumulated[place - 1])
        between = low + np.clip(share, 0.0, 1.0) * (high - low)
    return [float(v) for v in np.where(np.isfinite(high), np.where(low == high, low, between), high)]
