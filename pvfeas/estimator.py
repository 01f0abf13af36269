"""One scenario on one sample: every distribution that an answer needs.

Distribution functions are returned per replicate, shape (values, replicates), so that every
number comes with its error.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, fields, is_dataclass, replace
from typing import Any

import numpy as np
from scipy import special

from pvfeas.conditional import Interval, LawPivot, Pivot
from pvfeas.decision import Rule, signal_intervals
from pvfeas.laws import Array
from pvfeas.points import Sample
from pvfeas.realisation import Realisation
from pvfeas.required import raw_needed

STRATA = 8  # of the noise: errors of a chance become 2 to 6 times smaller (measured on the example studies)
Select = Callable[[Array], Array]


@dataclass(frozen=True)
class Estimator:
    """Probabilities of one scenario, the pivot integrated at every point.

    realisation holds the scenario at the points of sample, along the pivot's nodes where it
    has them; extra counts that node axis. noise are standard normal scores of the
    measurement's own noise.
    """

    rule: Rule
    sample: Sample
    realisation: Realisation
    pivot: Pivot
    noise: Array
    extra: int = 0

    def _times(self, values: Array) -> Array:
        """Values as the leading axis of everything else."""
        behind = self.extra + len(self.sample.groups) + 2
        return np.asarray(values, dtype=float).reshape((-1,) + (1,) * behind)

    def only(self, group: int, member: int) -> Estimator:
        """The same with one member of one ensemble group alone."""
        axis = group - len(self.sample.groups) - 2
        weights = tuple((1.0,) if i == group else one for i, one in enumerate(self.sample.weights))
        pivot = (
            self.pivot.only(axis, member) if isinstance(self.pivot, LawPivot) else restricted(self.pivot, axis, member)
        )
        return Estimator(
            self.rule, replace(self.sample, draws={}, scores={}, weights=weights),
            restricted(self.realisation, axis, member), pivot, self.noise, self.extra,
        )  # fmt: skip

    def needed(self, wall: Array) -> Array:
        """The smallest signal that meets the goal by wall time, whether the time is usable yet or not."""
        return raw_needed(self.realisation, self.rule, wall)

    def _beyond(self, least: Array) -> list[Interval]:
        """Intervals of the signed signal in which the goal's kind of signal is at least `least`."""
        return beyond(self.rule, least)

    def met_by(self, wall: Array, select: Select | None = None) -> Array:
        """P(required wall time <= wall)."""
        points = self._met(self._times(wall))
        return (select or self.sample.average)(points)

    def met_by_live(self, live: Array) -> Array:
        """P(required live time <= live)."""
        return self.sample.average(self._met(self._times(live) / self.realisation.averaging.live_per_wall))

    def _met(self, wall: Array) -> Array:
        return self.pivot.probability(self._beyond(self.needed(wall)), self.realisation.averaging.margin(wall))

    def chance_by(self, wall: Array, select: Select | None = None) -> Array:
        """Chance that the goal is met by wall time; select averages in another way than over everything."""
        return (select or self.sample.average)(self.chance_points(wall))

    def chance_points(self, wall: Array) -> Array:
        """Chance at every point, before averaging."""
        real, at = self.realisation, self._times(wall)
        sigma, relative = np.sqrt(real.averaging.best_variance(at)), real.relative_variance(at)
        usable = real.averaging.margin(at)
        total: Array = np.zeros(())
        for noise in self._strata():
            intervals = signal_intervals(self.rule, sigma, sigma, relative, noise)
            total = total + self.pivot.probability(intervals, usable) / STRATA
        return total

    def _strata(self) -> list[Array]:
        """Scores of the noise: each point's own, once in each of equally probable strata."""
        place = special.ndtr(self.noise)
        return [np.asarray(special.ndtri((stratum + place) / STRATA)) for stratum in range(STRATA)]

    def ratio_above(self, divisor: Array, value: Array) -> Array:
        """P(|signal| / divisor > value), divisor at every point."""
        least = self._times(value) * divisor
        return self._average([(least, np.array(np.inf)), (np.array(-np.inf), -least)])

    def _average(self, intervals: list[Interval]) -> Array:
        return self.sample.average(self.pivot.probability(intervals))


def restricted(value: Any, axis: int, place: int) -> Any:
    """Any structure of arrays with one place of one axis (counted from the end) kept, where an array has that axis."""
    if isinstance(value, np.ndarray):
        return np.take(value, [place], axis) if value.ndim >= -axis and value.shape[axis] > 1 else value
    if isinstance(value, tuple):
        return tuple(restricted(one, axis, place) for one in value)
    if is_dataclass(value) and not isinstance(value, type):
        return replace(value, **{f.name: restricted(getattr(value, f.name), axis, place) for f in fields(value)})
    return value


def beyond(rule: Rule, least: Array) -> list[Interval]:
    """Where a signed signal counts as at least `least`: both signs, or the predicted one only."""
    infinite = np.array(np.inf)
    if not rule.one_signed:
        return [(least, infinite), (-infinite, -least)]
    return [(least, infinite)] if rule.predicted_sign > 0 else [(-infinite, -least)]
