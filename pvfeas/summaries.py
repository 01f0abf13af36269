"""Distributions in five numbers, with their errors."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from pvfeas.conditional import Pivot
from pvfeas.laws import Array
from pvfeas.points import Sample
from pvfeas.quantiles import Distribution, Quantile, of_values, pooled, solve
from pvfeas.results import Quantiles

PROBABILITIES: Mapping[str, float] = {"q05": 0.05, "q16": 0.16, "q50": 0.5, "q84": 0.84, "q95": 0.95}


def five(found: Mapping[str, tuple[float | None, float | None]], unit: str, nominal: float | None) -> Quantiles:
    """The result from (value, error) for each of the five names."""
    values = {name: value for name, (value, _) in found.items()}
    errors = {name: error for name, (value, error) in found.items() if value is not None}
    return Quantiles(unit=unit, nominal=nominal, error=errors, **values)


def constant(value: float | None, unit: str) -> Quantiles:
    """A quantity that is the same in every draw."""
    return five(dict.fromkeys(PROBABILITIES, (value, 0.0)), unit, value)


def plain(sample: Sample, values: Array, unit: str, nominal: float | None) -> Quantiles:
    """Quantiles of a quantity that is known at every point; infinite values become null."""
    if values.size == 1:
        return constant(_finite(float(values.reshape(-1)[0])), unit)
    draws, weights = flattened(sample, values)
    numbers, errors = of_values(draws, weights, list(PROBABILITIES.values()))
    pairs = {
        name: (_finite(number), _finite(error))
        for name, number, error in zip(PROBABILITIES, numbers, errors, strict=True)
    }
    return five(pairs, unit, nominal)


def rough(sample: Sample, values: Array, unit: str, nominal: float | None) -> Quantiles:
    """As plain, without errors: first guesses."""
    numbers = pooled(*flattened(sample, values), list(PROBABILITIES.values()))
    return five({name: (_finite(one), None) for name, one in zip(PROBABILITIES, numbers, strict=True)}, unit, nominal)


def scaled(found: Quantiles, factor: float) -> Quantiles:
    """Quantiles, nominal value and errors times one number."""

    def times(value: float | None) -> float | None:
        return None if value is None else value * factor

    pairs = {name: (times(getattr(found, name)), times(found.error.get(name))) for name in PROBABILITIES}
    return five(pairs, found.unit, times(found.nominal))


def flattened(sample: Sample, values: Array, only: tuple[int, int] | None = None) -> tuple[Array, Array]:
    """Values and weights as (draws, replicates), the members of every group enumerated.

    only: (group, member) that counts by itself.
    """
    replicates, points = sample.shape
    counts = tuple(len(weights) for weights in sample.weights)
    full = np.broadcast_to(values, (*counts, replicates, points))
    weight: Array = np.ones((1,) * len(counts) + (1, 1))
    for axis, weights in enumerate(sample.weights):
        share = np.asarray(weights)
        if only is not None and only[0] == axis:
            share = np.where(np.arange(len(weights)) == only[1], 1.0, 0.0)
        weight = weight * share.reshape((-1,) + (1,) * (len(counts) - axis + 1))
    weight = np.broadcast_to(weight, full.shape)
    return _columns(full), _columns(weight)


def _columns(values: Array) -> Array:
    return np.moveaxis(values, -2, -1).reshape(-1, values.shape[-2])


def positive(distribution: Distribution, starts: Quantiles, unit: str, nominal: float | None) -> Quantiles:
    """Quantiles of a positive quantity from its distribution function; starts: rough ones."""
    first = guesses(starts, nominal)
    found = solve(distribution, list(PROBABILITIES.values()), first, abs(float(np.log(first[3] / first[1]))) / 2.0)
    return five(_pairs(dict(zip(PROBABILITIES, found, strict=True))), unit, nominal)


def guesses(starts: Quantiles, nominal: float | None) -> list[float]:
    """Rough quantiles without gaps: what is not known is taken from its neighbour."""
    known = [value for name in PROBABILITIES if (value := getattr(starts, name)) is not None and value > 0]
    spare = known[-1] if known else (nominal or 1.0)
    values = [getattr(starts, name) for name in PROBABILITIES]
    return [value if value is not None and value > 0 else spare for value in values]


def signed(sample: Sample, pivot: Pivot, rough: Quantiles, unit: str, nominal: float) -> Quantiles:
    """Quantiles of a signed quantity from its pivot: either side of zero on its own logarithm."""
    infinite = np.array(np.inf)
    axes = (1,) * (len(sample.groups) + 2)

    def up_to(size: Array) -> Array:
        least = np.asarray(size).reshape(-1, *axes)
        return 1.0 - sample.average(pivot.probability([(least, infinite)]))

    def down_to(size: Array) -> Array:
        least = np.asarray(size).reshape(-1, *axes)
        return 1.0 - sample.average(pivot.probability([(-infinite, -least)]))

    not_positive, not_negative = float(up_to(np.zeros(1)).mean()), float(down_to(np.zeros(1)).mean())
    found: dict[str, Quantile] = {name: Quantile(0.0, 0.0) for name in PROBABILITIES}
    above = [name for name, p in PROBABILITIES.items() if p > not_positive]
    below = [name for name, p in PROBABILITIES.items() if p < 1.0 - not_negative and name not in above]
    start = {name: abs(getattr(rough, name) or nominal or 1.0) for name in PROBABILITIES}
    if above:
        found |= zip(above, solve(up_to, [PROBABILITIES[n] for n in above], [start[n] for n in above]), strict=True)
    if below:
        mirrored = solve(down_to, [1.0 - PROBABILITIES[n] for n in below], [start[n] for n in below])
        found |= zip(below, (Quantile(None if m.value is None else -m.value, m.error) for m in mirrored), strict=True)
    return five(_pairs(found), unit, nominal)


def _pairs(found: Mapping[str, Quantile]) -> dict[str, tuple[float | None, float | None]]:
    return {name: (quantile.value, quantile.error) for name, quantile in found.items()}


def _finite(value: float) -> float | None:
    return value if np.isfinite(value) else None
