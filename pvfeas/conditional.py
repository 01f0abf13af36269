"""Probabilities of signal intervals with one input integrated exactly at every point.

What is asked of a draw is always whether its signed signal lies in some intervals. The
input that is integrated, the pivot, makes that a probability between 0 and 1 at every point
of the others, which is what makes few points enough. LawPivot: the signal is proportional
to the pivot. NodePivot: any dependence, by the crossings of a margin along the pivot's
score. NoPivot: nothing is left to integrate.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Protocol

import numpy as np
from scipy import special

from pvfeas.laws import Array, Law

Interval = tuple[Array, Array]  # open (lower, upper) in Hz, ends may be infinite

NODES: Array = np.arange(-6.5, 6.5001, 0.25)


class Pivot(Protocol):
    """How the signed signal is distributed at every point."""

    def probability(self, intervals: Sequence[Interval]) -> Array:
        """P(signal in the union of disjoint intervals): (times …, groups …, replicates, points)."""


@dataclass(frozen=True)
class NoPivot:
    """The signal itself is known at every point."""

    signal: Array

    def probability(self, intervals: Sequence[Interval]) -> Array:
        """1 where the signal lies in an interval, else 0."""
        inside: Array = np.zeros(())
        for lower, upper in intervals:
            inside = inside + ((self.signal > lower) & (self.signal < upper))
        return np.asarray(inside, dtype=float)


@dataclass(frozen=True)
class LawPivot:
    """signal = factor × x, where x follows one law, or one law for each member of a group.

    location and width place the score of x, given the correlated inputs: score = location + width × N(0, 1).
    """

    factor: Array
    laws: tuple[Law, ...]
    axis: int = 0  # of the members, counted from the end; 0 where there is one law only
    location: Array | None = None
    width: float = 1.0

    def probability(self, intervals: Sequence[Interval]) -> Array:
        """Sum of the law's probabilities of the intervals divided by the factor."""
        total: Array = np.zeros(())
        for lower, upper in intervals:
            total = total + self._one(lower, upper)
        return total

    def _one(self, lower: Array, upper: Array) -> Array:
        factor = self.factor
        with np.errstate(divide="ignore", invalid="ignore"):
            low, high = lower / factor, upper / factor
        silent = np.asarray(np.where((lower < 0) & (upper > 0), 1.0, 0.0))
        first, last = np.where(factor > 0, low, high), np.where(factor > 0, high, low)
        return np.asarray(np.where(factor == 0, silent, self._between(first, last)))

    def _between(self, first: Array, last: Array) -> Array:
        if np.all(np.isposinf(last)):
            return self._tail(first, above=True)
        if np.all(np.isneginf(first)):
            return self._tail(last, above=False)
        upper_side = self._tail(first, above=True) - self._tail(last, above=True)
        lower_side = self._tail(last, above=False) - self._tail(first, above=False)
        return np.asarray(np.where(first > self.laws[0].median, upper_side, lower_side).clip(0.0))

    def _tail(self, value: Array, above: bool) -> Array:
        if len(self.laws) == 1:
            return self._tail_of(self.laws[0], value, above)
        axis = value.ndim + self.axis
        parts = []
        for member, law in enumerate(self.laws):
            at = np.take(value, [min(member, value.shape[axis] - 1)], axis=axis)
            parts.append(self._tail_of(law, at, above))
        return np.concatenate(parts, axis=axis)

    def _tail_of(self, law: Law, value: Array, above: bool) -> Array:
        if above and value.size and law.upper <= value.min():
            return np.zeros(value.shape)
        if not above and value.size and law.lower >= value.max():
            return np.zeros(value.shape)
        tail = law.above(value) if above else law.below(value)
        if self.location is None:
            return tail
        score = -special.ndtri(tail) if above else special.ndtri(tail)
        shifted = (score - self.location) / self.width
        return np.asarray(special.ndtr(-shifted if above else shifted))


@dataclass(frozen=True)
class NodePivot:
    """The signal and the intervals are given at NODES of the pivot's score, along one axis.

    axis counts from the end and is that of the nodes; scale makes the margin smooth (a sigma).
    """

    signal: Array
    scale: Array
    axis: int

    def probability(self, intervals: Sequence[Interval]) -> Array:
        """Normal probability of the scores at which the margin is positive; the node axis is gone."""
        best: Array | None = None
        for lower, upper in intervals:
            with np.errstate(invalid="ignore", divide="ignore"):
                margin = np.minimum(self.signal - lower, upper - self.signal) / self.scale
                margin = np.clip(np.where(np.isnan(margin), -50.0, margin), -50.0, 50.0)
            best = margin if best is None else np.maximum(best, margin)
        assert best is not None
        moved = np.moveaxis(np.asarray(best), self.axis, 0)
        if moved.shape[0] == 1:  # the pivot makes no difference here
            return np.asarray(moved[0] > 0, dtype=float)
        return positive_probability(moved)


def positive_probability(margin: Array) -> Array:
    """P(margin > 0) for a standard normal score, from margins at NODES along the first axis.

    Crossings by cubic Hermite interpolation (Catmull-Rom slopes) of the margin between nodes.
    """
    sign = margin > 0
    total = sign[0].astype(float)
    where = np.nonzero(sign[1:] != sign[:-1])
    if not where[0].size:
        return total
    k, rest = where[0], where[1:]
    last = len(NODES) - 1
    before, here, there, after = (margin[(np.clip(k + d, 0, last), *rest)] for d in (-1, 0, 1, 2))
    left, right = (there - before) / 2.0, (after - here) / 2.0
    left = np.where(k == 0, there - here, left)
    right = np.where(k == last - 1, there - here, right)
    fraction = _hermite_root(here, there, left, right)
    crossing = NODES[k] + fraction * (NODES[1] - NODES[0])
    upward = np.where(there > 0, 1.0, -1.0)
    np.add.at(total, rest, upward * special.ndtr(-crossing))
    return np.asarray(np.clip(total, 0.0, 1.0))


def _hermite_root(here: Array, there: Array, left: Array, right: Array) -> Array:
    """Root in (0, 1) of the cubic with these end values and slopes; regula falsi from the chord."""
    low, high = np.zeros_like(here), np.ones_like(here)
    rising = there > here
    fraction = here / (here - there)
    for _ in range(6):
        value, slope = _hermite(fraction, here, there, left, right)
        above = (value > 0) == rising
        low, high = np.where(above, low, fraction), np.where(above, fraction, high)
        with np.errstate(divide="ignore", invalid="ignore"):
            newton = fraction - value / slope
        inside = (newton > low) & (newton < high)
        fraction = np.where(inside, newton, (low + high) / 2.0)
    return np.asarray(fraction)


def _hermite(x: Array, here: Array, there: Array, left: Array, right: Array) -> tuple[Array, Array]:
    square, cube = x * x, x * x * x
    value = (
        here * (2 * cube - 3 * square + 1)
        + left * (cube - 2 * square + x)
        + there * (3 * square - 2 * cube)
        + right * (cube - square)
    )
    slope = (
        6 * here * (square - x)
        + left * (3 * square - 4 * x + 1)
        + 6 * there * (x - square)
        + right * (3 * square - 2 * x)
    )
    return value, slope
