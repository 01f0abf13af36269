"""Probabilities of signal intervals with one input integrated exactly at every point.

What is asked of a draw is always whether its signed signal lies in some intervals. The
input that is integrated, the pivot, makes that a probability between 0 and 1 at every point
of the others, which is what makes few points enough. LawPivot: the signal is proportional
to the pivot. NodePivot: any dependence, by the crossings of a margin along the pivot's
score. NoPivot: nothing is left to integrate.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import Any, Protocol

import numpy as np
from numpy.typing import NDArray
from scipy import special

from pvfeas.laws import Array, Law

Booleans = NDArray[np.bool_]
Integers = NDArray[np.int64]
Index = tuple[Integers, ...]
Interval = tuple[Array, Array]  # open (lower, upper) in Hz, ends may be infinite

NODES: Array = np.arange(-6.5, 6.5001, 0.5)
AROUND: Integers = np.arange(-2, 4)[:, None]  # the neighbours of an interval between nodes
HERE = 2  # place in AROUND of its first node
FAR = 60.0  # logarithms differ by less wherever it matters


class Pivot(Protocol):
    """How the signed signal is distributed at every point."""

    def probability(self, intervals: Sequence[Interval], allowed: Array | None = None) -> Array:
        """P(signal in the union of disjoint intervals): (times …, groups …, replicates, points).

        allowed: a smooth number that must be positive too; None where nothing else is asked.
        """


@dataclass(frozen=True)
class NoPivot:
    """The signal itself is known at every point."""

    signal: Array

    def probability(self, intervals: Sequence[Interval], allowed: Array | None = None) -> Array:
        """1 where the signal lies in an interval, else 0."""
        inside: Array = np.zeros(())
        for lower, upper in intervals:
            inside = inside + ((self.signal > lower) & (self.signal < upper))
        return np.asarray(inside if allowed is None else inside * (allowed > 0), dtype=float)


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

    def only(self, axis: int, member: int) -> LawPivot:
        """The same with one member of the ensemble group on that axis alone."""

        def kept(values: Array) -> Array:
            return np.take(values, [member], axis) if values.ndim >= -axis and values.shape[axis] > 1 else values

        location = None if self.location is None else kept(self.location)
        if axis != self.axis:
            return LawPivot(kept(self.factor), self.laws, self.axis, location, self.width)
        return LawPivot(kept(self.factor), (self.laws[member],), 0, location, self.width)

    def probability(self, intervals: Sequence[Interval], allowed: Array | None = None) -> Array:
        """Sum of the law's probabilities of the intervals divided by the factor."""
        total: Array = np.zeros(())
        for lower, upper in intervals:
            total = total + self._one(lower, upper)
        return total if allowed is None else np.asarray(np.where(allowed > 0, total, 0.0))

    @cached_property
    def _upright(self) -> bool:
        """Whether the signal grows with x everywhere."""
        return bool(np.all(self.factor > 0))

    def _one(self, lower: Array, upper: Array) -> Array:
        factor = self.factor
        if self._upright:
            if self.laws[0].lower >= 0.0 and np.all(np.asarray(upper) <= 0.0) and len(self.laws) == 1:
                return np.zeros(np.broadcast_shapes(np.shape(upper), factor.shape))
            return self._between(_divided(lower, factor), _divided(upper, factor))
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


def _divided(end: Array, factor: Array) -> Array:
    """The end over positive factors; one infinity for all stays one."""
    return end if np.size(end) == 1 and np.all(np.isinf(end)) else np.asarray(end / factor)


@dataclass(frozen=True)
class NodePivot:
    """The signal and the intervals are given at NODES of the pivot's score, along one axis, counted from the end."""

    signal: Array
    axis: int

    def probability(self, intervals: Sequence[Interval], allowed: Array | None = None) -> Array:
        """Normal probability of the scores at which the signal lies in an interval; the node axis is gone."""
        ends = [pair for low, high in intervals for pair in ((self.signal, low), (high, self.signal))]
        beyond = [np.asarray(greater > smaller) for greater, smaller in ends]
        inside: Booleans = np.zeros((), dtype=bool)
        for i in range(0, len(beyond), 2):
            inside = inside | (beyond[i] & beyond[i + 1])
        inside = inside if allowed is None else inside & (allowed > 0)

        def margin(at: Index) -> Array:
            found: Array = np.asarray(FAR)
            for (greater, smaller), flags in zip(ends, beyond, strict=True):
                flag = _at(flags, inside.shape, at)
                crossed = flag[HERE] != flag[HERE + 1]  # this end is the one that is crossed
                one = lead(_at(greater, inside.shape, at), _at(smaller, inside.shape, at))
                found = np.where(crossed, one, found)
            return found if allowed is None else flipping([found, _at(allowed, inside.shape, at)])

        return along_nodes(inside, margin, self.axis)


@dataclass(frozen=True)
class NodeValues:
    """A quantity that cannot be negative at NODES of one input's score along one axis.

    allowed: a smooth number, not positive where the quantity is infinite.
    """

    values: Array
    axis: int
    allowed: Array | None = None

    def up_to(self, value: Array) -> Array:
        """P(quantity <= value) at every point; value has an axis of length 1 where the nodes are, which goes."""
        inside = np.asarray(self.values < value)
        inside = inside if self.allowed is None else inside & (self.allowed > 0)

        def margin(at: Index) -> Array:
            found = lead(_at(value, inside.shape, at), _at(self.values, inside.shape, at))
            return found if self.allowed is None else flipping([found, _at(self.allowed, inside.shape, at)])

        return along_nodes(inside, margin, self.axis)


def _at(values: NDArray[Any], shape: tuple[int, ...], at: Index) -> NDArray[Any]:
    return np.asarray(np.broadcast_to(values, shape)[at])


def flipping(margins: Sequence[Array]) -> Array:
    """Of several margins at neighbouring nodes that must all be positive, the one that changes its sign there.

    The least of those where several do; taking the least of all would bend it where another one is small.
    """
    found: Array = np.asarray(FAR)
    for one in margins:
        changes = (one[HERE] > 0) != (one[HERE + 1] > 0)
        found = np.minimum(found, np.where(changes, one, FAR))
    return found


def all_positive(margins: Sequence[Array], axis: int) -> Array:
    """Probability of the scores for which all margins, known at NODES along one axis, are positive."""
    full = np.broadcast_arrays(*margins)
    inside = np.all([one > 0 for one in full], axis=0)
    return along_nodes(inside, lambda at: flipping([one[at] for one in full]), axis)


def lead(first: Array, second: Array) -> Array:
    """By how much first is more than second at neighbouring nodes (first axis), fit for interpolation.

    Where all neighbours have one sign the difference of the logarithms, which is linear in the score of a
    lognormal law; else the plain difference over its largest size, linear for a normal one. Infinities are cut.
    """
    with np.errstate(invalid="ignore", divide="ignore"):
        logarithms = np.log(np.abs(first)) - np.log(np.abs(second))
        plain = first - second
        alike = np.all(first > 0, axis=0) & np.all(second > 0, axis=0)
        opposite = np.all(first < 0, axis=0) & np.all(second < 0, axis=0)
    largest = np.max(np.where(np.isfinite(plain), np.abs(plain), 0.0), axis=0)
    scaled = plain / np.where(largest > 0, largest, 1.0)
    found = np.where(alike, logarithms, np.where(opposite, -logarithms, scaled))
    return np.asarray(np.clip(np.nan_to_num(found, nan=-FAR, posinf=FAR, neginf=-FAR), -FAR, FAR))


def excess(first: Array, second: Array) -> Array:
    """(first - second)/(|first| + |second|): the sign of the difference as a smooth number in [-1, 1].

    For positive numbers it is tanh of half the difference of their logarithms. Infinities give 1 or -1,
    two equal ones -1.
    """
    with np.errstate(invalid="ignore", divide="ignore"):
        ratio = (first - second) / (np.abs(first) + np.abs(second))
    return np.asarray(np.where(np.isnan(ratio), np.where(first > second, 1.0, -1.0), ratio))


def along_nodes(inside: Booleans, margin: Callable[[Index], Array], axis: int) -> Array:
    """Probability of the scores for which something is inside, known at NODES along one axis, which goes.

    margin: how far inside, at the indices of the neighbours in AROUND, positive where inside. Between two
    nodes of different kind its root is found by cubic Hermite interpolation, slopes from five-point
    differences where there are five points, else from three or two.
    """
    axis += inside.ndim
    if inside.shape[axis] == 1:  # the pivot makes no difference here
        return np.asarray(np.take(inside, 0, axis), dtype=float)
    front = np.moveaxis(inside, axis, 0)
    total: Array = front[0].astype(float)
    found = np.nonzero(front[1:] != front[:-1])
    if not found[0].size:
        return total
    k, rest = found[0], found[1:]

    node = np.clip(k + AROUND, 0, len(NODES) - 1)
    same = tuple(np.broadcast_to(one, node.shape) for one in rest)
    far_left, left, here, there, right, far_right = margin((*same[:axis], node, *same[axis:]))
    slope_here = _slope(k, far_left, left, there, right)
    slope_there = _slope(k + 1, left, here, right, far_right)
    crossing = NODES[k] + _hermite_root(here, there, slope_here, slope_there) * (NODES[1] - NODES[0])
    np.add.at(total, rest, np.where(front[(k + 1, *rest)], 1.0, -1.0) * special.ndtr(-crossing))
    return np.asarray(np.clip(total, 0.0, 1.0))


def _slope(k: Integers, far_left: Array, left: Array, right: Array, far_right: Array) -> Array:
    """Slope per node at node k from its neighbours; an end of NODES is its own neighbour."""
    last = len(NODES) - 1
    three = (right - left) / np.where((k == 0) | (k == last), 1.0, 2.0)
    five = (8.0 * (right - left) - (far_right - far_left)) / 12.0
    return np.asarray(np.where((k > 1) & (k < last - 1), five, three))


def _hermite_root(here: Array, there: Array, left: Array, right: Array) -> Array:
    """Root in (0, 1) of the cubic with these end values and slopes: Newton from the chord, kept inside a bracket."""
    low, high = np.zeros_like(here), np.ones_like(here)
    rising = there > here
    square, cube = 3.0 * (there - here) - 2.0 * left - right, 2.0 * (here - there) + left + right
    flat = here == there  # rounding decided: anywhere between the two
    fraction = np.where(flat, 0.5, here / np.where(flat, 1.0, here - there))
    for _ in range(6):
        value = here + fraction * (left + fraction * (square + fraction * cube))
        slope = left + fraction * (2.0 * square + 3.0 * fraction * cube)
        above = (value > 0) == rising
        low, high = np.where(above, low, fraction), np.where(above, fraction, high)
        with np.errstate(divide="ignore", invalid="ignore"):
            newton = fraction - value / slope
        inside = (newton >= low) & (newton <= high)  # at the root it is one of them
        fraction, before = np.where(inside, newton, (low + high) / 2.0), fraction
        if np.all(np.abs(fraction - before) < 1e-12):
            break
    return np.asarray(fraction)
