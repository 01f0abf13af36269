"""The variance of the splitting seen against wall time, in parts."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from functools import cached_property

import numpy as np

from pvfeas.laws import Array
from pvfeas.reference import Passage, nothing, passage
from pvfeas.schedule import live_per_wall, supply_live_time
from pvfeas.systematics import after_of, averaged, group_freedom, resets_per_second, size_in_hertz, welch_satterthwaite
from pvfeas.tables import Line, Reference, Samples, Schedule, Switching, Systematic
from pvfeas.techniques.base import Technique

GOLDEN = (np.sqrt(5.0) - 1.0) / 2.0
NARROWINGS = 40  # of the golden section: 4e-9 of the range of ln t, below 1e-12 of the variance
Entry = tuple[Systematic, Array]  # with its size in Hz, or relative to the splitting where it is on the scale


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
    on_a = switching.on_a()
    return np.asarray(noise_a / on_a + noise_b / (1.0 - on_a))


def first_live_time(technique_a: Technique, technique_b: Technique, line: Line, switching: Switching) -> Array:
    """Live time after which both arms have had one whole cycle, s; zero for a technique without cycles."""
    if not technique_a.has_cycles:
        return np.zeros((1, 1))
    cycle_a, cycle_b = technique_a.cycle_time(line), technique_b.cycle_time(line)
    if switching.mode == "simultaneous":
        return np.asarray(np.maximum(cycle_a, cycle_b))
    on_a = switching.on_a()
    return np.asarray(np.maximum(cycle_a / on_a, cycle_b / (1.0 - on_a)))


def part_name(systematic: Systematic) -> str:
    """The name under which it stands in the budget: its own, or that of its group."""
    return f"systematics.{systematic.name}" if systematic.group is None else f"systematics.{systematic.group} (group)"


@dataclass(frozen=True)
class Averaging:
    """Variance of the splitting seen, Hz^2, against wall time, s. Arrays broadcast over draws.

    first, last: the wall times between which there is something to average (one whole cycle on
    each arm and one whole pattern; the sample's end, or infinity). statistical: variance × wall time, Hz^2 s.
    entries: systematics with their sizes in Hz; scale_entries: those that are fractions of the
    splitting. Everything stops at last.
    """

    live_per_wall: Array
    first: Array
    last: Array
    statistical: Array
    entries: tuple[Entry, ...]
    scale_entries: tuple[Entry, ...]
    schedule: Schedule
    reference: Passage = field(default_factory=nothing)

    def usable(self, wall: Array) -> Array:
        """Whether both arms have been measured by then, before the sample ended."""
        return np.asarray(np.minimum(wall, self.last) >= self.first)

    def margin(self, wall: Array) -> Array:
        """ln of the time there is to average over the time that is needed at least; positive where usable."""
        with np.errstate(divide="ignore"):
            found = np.log(np.minimum(wall, self.last)) - np.log(self.first)
        return np.asarray(np.nextafter(np.clip(found, -60.0, 60.0), np.inf))

    def parts(self, wall: Array) -> dict[str, Array]:
        """Variances by name: statistics, reference or reference.NAME, systematics.NAME or that of their group."""
        at = np.minimum(wall, self.last)
        elapsed = at * self.elapsed_per_wall
        noise = {f"reference.{one.name}": self.reference.variance(one, elapsed) for one in self.reference.shares}
        found = {"statistics": _over(self.statistical, at) * self.reference.trend(elapsed)}
        return found | (noise or {"reference": np.zeros((1, 1))}) | self._groups(self.entries, at)

    @property
    def elapsed_per_wall(self) -> Array:
        """Time that the pattern runs, dead times included, over wall time."""
        return np.asarray(self.live_per_wall / self.reference.live_share)

    def noise_level(self, wall: Array) -> Array:
        """Variance of statistics and reference noise × live time, Hz^2 s, at a wall time."""
        at = np.maximum(np.minimum(wall, self.last), self.first)
        found = [part for name, part in self.parts(at).items() if not name.startswith("systematics")]
        return np.asarray(sum(found, np.zeros((1, 1))) * at * self.live_per_wall)

    def _left(self, entries: Sequence[Entry], at: Array) -> list[Array]:
        """What is left of each entry, in its own unit."""
        live = at * self.live_per_wall
        return [averaged(systematic, size, at, live, self.schedule) for systematic, size in entries]

    def _groups(self, entries: Sequence[Entry], at: Array) -> dict[str, Array]:
        sums: dict[str, Array] = {}
        for (systematic, _), left in zip(entries, self._left(entries, at), strict=True):
            name = part_name(systematic)
            sums[name] = sums[name] + left if name in sums else left
        return {name: np.asarray(total**2) for name, total in sums.items()}

    def variance(self, wall: Array) -> Array:
        """The whole variance at a wall time."""
        at = np.minimum(wall, self.last)
        falling, constant, rising = self._coefficients
        total = _over(falling, at) + constant
        if self.reference.shares or self.reference.detrend:
            total = total + self._reference_extra(at)
        if rising is not None:
            with np.errstate(invalid="ignore"):
                total = total + np.where(rising > 0, rising * at, 0.0)
        for square, rate in self._resetting:
            total = total + square / np.maximum(1.0, at * rate)
        if self._grouped:
            total = total + sum(self._groups(self._grouped, at).values(), np.zeros((1, 1)))
        return np.asarray(total)

    def _reference_extra(self, at: Array) -> Array:
        """What few patterns and a fitted trend add to the long-run coefficients."""
        elapsed = at * self.elapsed_per_wall
        falling = self.statistical
        for one in self.reference.shares:
            falling = falling + one.falling / self.elapsed_per_wall
        found = _over(falling, at) * (self.reference.trend(elapsed) - 1.0)
        return sum((self.reference.correction(one, elapsed) for one in self.reference.shares), found)

    def relative_variance(self, wall: Array) -> Array:
        """Variance of the systematics on the scale, relative to the splitting squared."""
        parts = self._groups(self.scale_entries, np.minimum(wall, self.last))
        return sum(parts.values(), np.zeros((1, 1)))

    @cached_property
    def _grouped(self) -> tuple[Entry, ...]:
        """Entries that share a group with another one."""
        names = [part_name(systematic) for systematic, _ in self.entries]
        return tuple(entry for entry, name in zip(self.entries, names, strict=True) if names.count(name) > 1)

    def _alone(self, averages: str) -> list[Entry]:
        grouped = {id(systematic) for systematic, _ in self._grouped}
        return [entry for entry in self.entries if entry[0].averages == averages and id(entry[0]) not in grouped]

    @cached_property
    def _coefficients(self) -> tuple[Array, Array, Array | None]:
        """Variance × wall time, constant variance, variance over wall time, of what stands alone."""
        falling, constant = self.statistical, np.zeros((1, 1))
        for systematic, size in self._alone("as 1/t"):
            falling = falling + size**2 * after_of(systematic) / self.live_per_wall
        for _, size in self._alone("never"):
            constant = constant + size**2
        rising = [size**2 * self.live_per_wall / after_of(systematic) for systematic, size in self._alone("grows")]
        for one in self.reference.shares:
            falling = falling + one.falling / self.elapsed_per_wall
            constant = constant + one.constant
            if np.any(one.rising):
                rising.append(np.asarray(one.rising * self.elapsed_per_wall))
        return falling, constant, sum(rising, np.zeros((1, 1))) if rising else None

    @cached_property
    def _resetting(self) -> list[tuple[Array, Array]]:
        """Variance and resets per wall time of what is reset and stands alone."""
        return [(size**2, resets_per_second(one, self.schedule)) for one, size in self._alone("per reset")]

    @property
    def _grows(self) -> bool:
        growing = any(systematic.averages == "grows" for systematic, _ in self.entries)
        return growing or any(np.any(one.rising) for one in self.reference.shares)

    def best_time(self, wall: Array) -> Array:
        """The wall time up to `wall` at which the variance is least: a campaign may stop there.

        Only growing systematics make it differ from `wall`. Between breakpoints (resets
        beginning to count) the variance is a sum of exponentials of ln t with positive
        coefficients, hence convex: its least value on each piece in closed form, by golden section
        where entries are grouped.
        """
        best = np.asarray(wall, dtype=float)
        if not self._grows:
            return best
        for candidate in self._minima:
            earlier = np.minimum(candidate, wall)
            best = np.where(self.variance(earlier) < self.variance(best), earlier, best)
        return best

    def best_variance(self, wall: Array) -> Array:
        """The smallest variance up to a wall time."""
        return self.variance(self.best_time(wall))

    def floor(self) -> Array:
        """The variance left when there is no end to the wall time; the sample's end still counts."""
        return self.best_variance(np.array(np.inf))

    @cached_property
    def _minima(self) -> list[Array]:
        """Per draw, the time of least variance on every piece."""
        ends = [np.maximum(self.first, 1e-12), *self._breakpoints, np.minimum(self.last, 1e25)]
        shape = np.broadcast_shapes(*(np.shape(end) for end in ends), np.shape(self.variance(ends[0])))
        edges = np.sort(np.stack([np.broadcast_to(np.log(end), shape) for end in ends]), axis=0)
        edges = np.clip(edges, np.log(ends[0]), np.log(ends[-1]))
        find = self._least if self._grouped else self._least_alone
        return [find(edges[i], edges[i + 1]) for i in range(len(ends) - 1)]

    @property
    def _breakpoints(self) -> list[Array]:
        return [
            np.asarray(1.0 / resets_per_second(systematic, self.schedule))
            for systematic, _ in self.entries
            if systematic.averages == "per reset"
        ]

    def _least_alone(self, low: Array, high: Array) -> Array:
        """The best time between two values of ln t without groups: A/t + C + B t is least at sqrt(A/B)."""
        falling, _, rising = self._coefficients
        middle = np.exp((low + high) / 2.0)
        for square, rate in self._resetting:
            falling = falling + np.where(middle * rate > 1.0, square / rate, 0.0)
        with np.errstate(divide="ignore", invalid="ignore"):
            best = np.sqrt(falling / np.asarray(rising))
        best = np.where(np.asarray(rising) > 0, best, np.inf)
        return np.asarray(np.clip(best, np.exp(low), np.exp(high)))

    def _least(self, low: Array, high: Array) -> Array:
        """The best time between two values of ln t, whatever is grouped, by golden section."""
        left, right = high - GOLDEN * (high - low), low + GOLDEN * (high - low)
        at_left, at_right = self.variance(np.exp(left)), self.variance(np.exp(right))
        for _ in range(NARROWINGS):
            lower = at_left < at_right
            low, high = np.where(lower, low, left), np.where(lower, right, high)
            new = np.where(lower, high - GOLDEN * (high - low), low + GOLDEN * (high - low))
            at_new = self.variance(np.exp(new))
            left, right = np.where(lower, new, right), np.where(lower, left, new)
            at_left, at_right = np.where(lower, at_new, at_right), np.where(lower, at_left, at_new)
        return np.asarray(np.exp((low + high) / 2.0))

    def degrees_of_freedom(self, wall: Array) -> Array:
        """Effective degrees of freedom of the variance at a wall time (Welch–Satterthwaite); infinite without dof."""
        at = np.minimum(wall, self.last)
        members: dict[str, list[tuple[Array, Array]]] = {}
        for (systematic, _), left in zip(self.entries, self._left(self.entries, at), strict=True):
            freedom = np.array(np.inf) if systematic.dof is None else systematic.dof
            members.setdefault(part_name(systematic), []).append((left, freedom))
        variances, freedoms = [_over(self.statistical, at)], [np.array(np.inf)]
        for entries in members.values():
            sizes, known = [size for size, _ in entries], [freedom for _, freedom in entries]
            variances.append(np.square(sum(sizes, np.zeros(()))))
            freedoms.append(group_freedom(sizes, known))
        return welch_satterthwaite(variances, freedoms)


def _over(coefficient: Array, at: Array) -> Array:
    with np.errstate(divide="ignore", invalid="ignore"):
        return np.asarray(np.where(coefficient > 0, coefficient / at, 0.0))


def averaging_of(
    technique_a: Technique,
    technique_b: Technique,
    line: Line,
    switching: Switching,
    samples_a: Samples,
    samples_b: Samples,
    schedule: Schedule,
    systematics: Sequence[Systematic],
    references: Sequence[Reference] = (),
) -> Averaging:
    """Put a scenario's parts together."""
    reference = passage(references, switching, technique_a, technique_b, line)
    running = live_per_wall(schedule)
    duty = running * reference.live_share
    both = switching.mode == "simultaneous"
    share_a = np.asarray(1.0 if both else switching.on_a())
    share_b = np.asarray(1.0 if both else 1.0 - switching.on_a())
    lasts = np.minimum(supply_live_time(samples_a, share_a), supply_live_time(samples_b, share_b))
    width = technique_a.interrogation_width(line)
    sizes = [(one, size_in_hertz(one, width, line.frequency)) for one in systematics]
    return Averaging(
        live_per_wall=duty,
        first=np.maximum(first_live_time(technique_a, technique_b, line, switching) / duty, reference.period / running),
        last=lasts / duty,
        statistical=splitting_noise(technique_a, technique_b, line, switching) / duty,
        entries=tuple(pair for pair in sizes if pair[0].on != "scale"),
        scale_entries=tuple(pair for pair in sizes if pair[0].on == "scale"),
        schedule=schedule,
        reference=reference,
    )
