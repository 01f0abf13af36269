"""The variance of the splitting seen against wall time, in parts."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from pvfeas.laws import Array
from pvfeas.schedule import live_per_wall, supply_live_time
from pvfeas.systematics import averaged, resets_per_second, size_in_hertz, welch_satterthwaite
from pvfeas.tables import Line, Samples, Schedule, Switching, Systematic
from pvfeas.techniques.base import Technique

GOLDEN = (np.sqrt(5.0) - 1.0) / 2.0
NARROWINGS = 60  # of the golden section: 0.618^60 = 3e-13 of the range of ln t


def purity(ee_a: Array, ee_b: Array) -> Array:
    """Splitting seen over splitting: F = (ee_a + ee_b)/2, each the excess of the arm's own enantiomer.

    Derived for unresolved lines: a mixture's line centre lies at the mean weighted with the shares.
    """
    return np.asarray((ee_a + ee_b) / 2.0)


def arm_noise(technique: Technique, line: Line) -> Array:
    """S^2 = variance of the line centre × cycle time, Hz^2 s of live time on that arm."""
    return np.asarray(technique.centre_variance(line) * technique.cycle_time(line))


def splitting_noise(technique_a: Technique, technique_b: Technique, line: Line, switching: Switching) -> Array:
    """Variance of the splitting seen × live time, Hz^2 s: the one place of every factor of 2.

    Alternating with live fraction f on a: S_a^2/f + S_b^2/(1 - f), 4 S^2 for equal arms;
    simultaneous: S_a^2 + S_b^2. A technique that states the splitting itself brings its own.
    """
    if technique_a.states_splitting:
        return arm_noise(technique_a, line)
    noise_a, noise_b = arm_noise(technique_a, line), arm_noise(technique_b, line)
    if switching.mode == "simultaneous":
        return noise_a + noise_b
    return np.asarray(noise_a / switching.live_fraction + noise_b / (1.0 - switching.live_fraction))


def first_live_time(technique_a: Technique, technique_b: Technique, line: Line, switching: Switching) -> Array:
    """Live time after which both arms have had one whole cycle, s; zero for a technique without cycles."""
    if not technique_a.has_cycles:
        return np.zeros((1, 1))
    cycle_a, cycle_b = technique_a.cycle_time(line), technique_b.cycle_time(line)
    if switching.mode == "simultaneous":
        return np.asarray(np.maximum(cycle_a, cycle_b))
    return np.asarray(np.maximum(cycle_a / switching.live_fraction, cycle_b / (1.0 - switching.live_fraction)))


@dataclass(frozen=True)
class Averaging:
    """Variance of the splitting seen, Hz^2, against wall time, s. Arrays broadcast over draws.

    first, last: the wall times between which there is something to average (one whole cycle on
    each arm; the sample's end, or infinity). statistical: variance × wall time, Hz^2 s.
    entries: systematics with their sizes in Hz; scale_entries: those that are fractions of the
    splitting. Everything stops at last.
    """

    live_per_wall: Array
    first: Array
    last: Array
    statistical: Array
    entries: tuple[tuple[Systematic, Array], ...]
    scale_entries: tuple[tuple[Systematic, Array], ...]
    schedule: Schedule

    def usable(self, wall: Array) -> Array:
        """Whether both arms have been measured by then."""
        return np.asarray(np.asarray(wall) >= self.first)

    def parts(self, wall: Array) -> dict[str, Array]:
        """Variances by name: statistics, reference, systematics.NAME (or .GROUP, added linearly)."""
        at = np.minimum(wall, self.last)
        with np.errstate(divide="ignore"):
            found = {"statistics": np.asarray(self.statistical / at), "reference": np.zeros((1, 1))}
        return found | self._groups(self.entries, at)

    def _groups(self, entries: Sequence[tuple[Systematic, Array]], at: Array) -> dict[str, Array]:
        sums: dict[str, Array] = {}
        for systematic, size in entries:
            name = f"systematics.{systematic.group or systematic.name}"
            left = averaged(systematic, size, at, at * self.live_per_wall, self.schedule)
            sums[name] = sums[name] + left if name in sums else left
        return {name: np.asarray(total**2) for name, total in sums.items()}

    def variance(self, wall: Array) -> Array:
        """The whole variance at a wall time."""
        at = np.minimum(wall, self.last)
        with np.errstate(divide="ignore"):
            total = self.statistical / at + self._constant
        for part in self._changing:
            total = total + part(at)
        return np.asarray(total)

    def relative_variance(self, wall: Array) -> Array:
        """Variance of the systematics on the scale, relative to the splitting squared."""
        parts = self._groups(self.scale_entries, np.minimum(wall, self.last))
        return sum(parts.values(), np.zeros((1, 1)))

    @cached_property
    def _plain_entries(self) -> tuple[list[tuple[Systematic, Array]], list[tuple[Systematic, Array]]]:
        """Entries that stand alone and never average, and all others."""
        grouped = {s.group for s, _ in self.entries if s.group}
        constant = [(s, size) for s, size in self.entries if s.averages == "never" and s.group not in grouped]
        return constant, [(s, size) for s, size in self.entries if not (s.averages == "never" and s.group not in grouped)]

    @cached_property
    def _constant(self) -> Array:
        return sum((size**2 for _, size in self._plain_entries[0]), np.zeros((1, 1)))

    @cached_property
    def _changing(self) -> list[Callable[[Array], Array]]:
        """Functions of wall time for the entries that average or belong to a group."""
        alone = [(s, size) for s, size in self._plain_entries[1] if not s.group]
        made = [self._one(systematic, size) for systematic, size in alone]
        together = [(s, size) for s, size in self._plain_entries[1] if s.group]
        if together:
            made.append(lambda at: sum(self._groups(together, at).values(), np.zeros((1, 1))))
        return made

    def _one(self, systematic: Systematic, size: Array) -> Callable[[Array], Array]:
        square = size**2
        if systematic.averages == "per reset":
            rate = resets_per_second(systematic, self.schedule)
            return lambda at: np.asarray(square / np.maximum(1.0, at * rate))
        if systematic.averages == "as 1/t":
            over = square * systematic.after / self.live_per_wall
            return lambda at: _over(over, at)
        growth = square * self.live_per_wall / systematic.after
        return lambda at: np.asarray(growth * at)

    @property
    def _grows(self) -> bool:
        return any(systematic.averages == "grows" for systematic, _ in self.entries)

    def best_variance(self, wall: Array) -> Array:
        """The smallest variance up to a wall time: a campaign may stop at its best time.

        Only growing systematics make it differ from variance(wall). Between breakpoints (resets
        beginning to count) the variance is a sum of exponentials of ln t with positive
        coefficients, hence convex: golden section on each piece.
        """
        if not self._grows:
            return self.variance(wall)
        best = self.variance(wall)
        for candidate in self._minima:
            best = np.minimum(best, self.variance(np.minimum(candidate, wall)))
        return np.asarray(best)

    @cached_property
    def _minima(self) -> list[Array]:
        """Per draw, the time of least variance on every piece."""
        ends = [np.maximum(self.first, 1e-12), *self._breakpoints, np.minimum(self.last, 1e25)]
        shape = np.broadcast_shapes(*(np.shape(end) for end in ends), np.shape(self.variance(ends[0])))
        edges = np.sort(np.stack([np.broadcast_to(np.log(end), shape) for end in ends]), axis=0)
        edges = np.clip(edges, np.log(ends[0]), np.log(ends[-1]))
        return [self._least(edges[i], edges[i + 1]) for i in range(len(ends) - 1)]

    @property
    def _breakpoints(self) -> list[Array]:
        return [
            np.asarray(1.0 / resets_per_second(systematic, self.schedule))
            for systematic, _ in self.entries
            if systematic.averages == "per reset"
        ]

    def _least(self, low: Array, high: Array) -> Array:
        left, right = high - GOLDEN * (high - low), low + GOLDEN * (high - low)
        at_left, at_right = self.variance(np.exp(left)), self.variance(np.exp(right))
        for _ in range(NARROWINGS):
            lower = at_left < at_right
            low, high = np.where(lower, low, left), np.where(lower, right, high)
            left, right = high - GOLDEN * (high - low), low + GOLDEN * (high - low)
            at_left, at_right = self.variance(np.exp(left)), self.variance(np.exp(right))
        return np.asarray(np.exp((low + high) / 2.0))

    def degrees_of_freedom(self, wall: Array) -> Array:
        """Effective degrees of freedom of the variance at a wall time (Welch–Satterthwaite); infinite without dof."""
        at = np.minimum(wall, self.last)
        sizes = [averaged(s, size, at, at * self.live_per_wall, self.schedule) for s, size in self.entries]
        with np.errstate(divide="ignore"):
            variances = [np.asarray(self.statistical / at), *(np.square(size) for size in sizes)]
        freedoms = [np.array(np.inf), *(np.array(np.inf) if s.dof is None else s.dof for s, _ in self.entries)]
        return welch_satterthwaite(variances, freedoms)


def _over(coefficient: Array, at: Array) -> Array:
    with np.errstate(divide="ignore"):
        return np.asarray(coefficient / at)


def averaging_of(
    technique_a: Technique,
    technique_b: Technique,
    line: Line,
    switching: Switching,
    samples_a: Samples,
    samples_b: Samples,
    schedule: Schedule,
    systematics: Sequence[Systematic],
) -> Averaging:
    """Put a scenario's parts together."""
    duty = live_per_wall(schedule)
    both = switching.mode == "simultaneous"
    share_a = np.asarray(1.0 if both else switching.live_fraction)
    share_b = np.asarray(1.0 if both else 1.0 - switching.live_fraction)
    lasts = np.minimum(supply_live_time(samples_a, share_a), supply_live_time(samples_b, share_b))
    width = technique_a.interrogation_width(line)
    sizes = [(one, size_in_hertz(one, width, line.frequency)) for one in systematics]
    return Averaging(
        live_per_wall=duty,
        first=first_live_time(technique_a, technique_b, line, switching) / duty,
        last=lasts / duty,
        statistical=splitting_noise(technique_a, technique_b, line, switching) / duty,
        entries=tuple(pair for pair in sizes if pair[0].on != "scale"),
        scale_entries=tuple(pair for pair in sizes if pair[0].on == "scale"),
        schedule=schedule,
    )
