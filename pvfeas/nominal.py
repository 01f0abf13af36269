"""The study with every input at its median, and small steps away from it."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from pvfeas.laws import Array
from pvfeas.points import uncertain_addresses
from pvfeas.problem import Draws, Ensemble, Input


def member_order(ensemble: Ensemble) -> list[int]:
    """The members from the smallest median to the largest."""
    return sorted(range(len(ensemble.laws)), key=lambda member: ensemble.laws[member].median)


def ensemble_median(ensemble: Ensemble) -> float:
    """Weighted median of the members' medians; half-way between two that share the middle."""
    order = member_order(ensemble)
    cumulated = np.cumsum([ensemble.weights[member] for member in order])
    middle = int(np.searchsorted(cumulated, 0.5 - 1e-12))
    value = ensemble.laws[order[middle]].median
    if abs(cumulated[middle] - 0.5) < 1e-12 and middle + 1 < len(order):
        value = (value + ensemble.laws[order[middle + 1]].median) / 2.0
    return float(value)


def median_of(one: Input) -> float:
    """The nominal value of an input."""
    return ensemble_median(one.law) if isinstance(one.law, Ensemble) else float(one.law.median)


def nominal_draws(inputs: Sequence[Input]) -> Draws:
    """Every input at its median, as arrays of shape (1, 1)."""
    return {one.address: np.full((1, 1), median_of(one)) for one in inputs}


def stepped_draws(inputs: Sequence[Input], step: float, between: bool = True) -> tuple[tuple[str, ...], Draws]:
    """Medians, but one input moved by minus and plus `step` of its score in each column.

    Returns the moved addresses and draws of shape (1, 2 × addresses): minus, plus, minus, plus, …
    Ensembles move by the spread between their members and within them, or only within them.
    """
    moved = tuple(
        sorted(set(uncertain_addresses(inputs)) | {one.address for one in inputs if isinstance(one.law, Ensemble)})
    )
    draws: dict[str, Array] = {}
    for one in inputs:
        values = np.full((1, 2 * len(moved)), median_of(one))
        if one.address in moved:
            place = 2 * moved.index(one.address)
            values[0, place : place + 2] = _ends(one, step, between)
        draws[one.address] = values
    return moved, draws


def _ends(one: Input, step: float, between: bool) -> Array:
    if not isinstance(one.law, Ensemble):
        return np.asarray(one.law.from_score(np.array([-step, step])))
    medians = np.array([law.median for law in one.law.laws])
    weights = np.asarray(one.law.weights)
    spread = np.sqrt((weights * (medians - (weights * medians).sum()) ** 2).sum())
    inner = [float(law.from_score(np.array([step]))[0] - law.median) for law in one.law.laws]
    total = np.hypot(step * spread if between else 0.0, (weights * np.asarray(inner)).sum())
    return np.asarray(ensemble_median(one.law) + np.array([-total, total]))
