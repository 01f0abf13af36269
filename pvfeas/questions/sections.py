"""The parts of a scenario's answer, each from the scene it was drawn in."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, replace

import numpy as np

from pvfeas.conditional import NoPivot
from pvfeas.decision import Rule, chance, needed_signal
from pvfeas.integration import Scene
from pvfeas.laws import Array
from pvfeas.points import half_width
from pvfeas.problem import Ensemble, Problem
from pvfeas.quantiles import of_values, solve
from pvfeas.required import counted, needed_at, required_wall_time
from pvfeas.results import (
    Chance,
    Level,
    Limit,
    Moment,
    Quantiles,
    RequiredTime,
    Resolution,
    Sigma,
    Significance,
)
from pvfeas.summaries import PROBABILITIES, flattened, guesses, plain, positive, signed
from pvfeas.systematics import surviving_significance


@dataclass(frozen=True)
class Case:
    """A scenario on the full sample, on a small one (for first guesses) and at the nominal values."""

    problem: Problem
    rule: Rule
    limit_rule: Rule
    full: Scene
    small: Scene
    nominal: Scene

    @property
    def budget(self) -> float:
        """Wall time of the budget, s."""
        return self.problem.goal.within[-1]

    @property
    def integrates(self) -> bool:
        """Whether an input is integrated exactly."""
        return not isinstance(self.full.estimator.pivot, NoPivot)


def _number(values: Array) -> float:
    return float(np.asarray(values).reshape(-1)[0])


def finite(value: float) -> float | None:
    """None for what is not a finite number."""
    return value if np.isfinite(value) else None


def _plain(case: Case, values: Callable[[Scene], Array], unit: str) -> Quantiles:
    return plain(case.full.estimator.sample, values(case.full), unit, finite(_number(values(case.nominal))))


def splittings(case: Case) -> tuple[Quantiles, Quantiles]:
    """The true splitting and the splitting seen, Hz, signed."""
    results = []
    for pivot, values in (
        (case.full.splitting, lambda scene: scene.splitting_drawn),
        (case.full.seen, lambda scene: scene.sampled.factor * scene.splitting_drawn),
    ):
        rough = _plain(case, values, "Hz")
        if pivot is not None:
            rough = signed(case.full.estimator.sample, pivot, rough, "Hz", rough.nominal or 0.0)
        results.append(rough)
    return results[0], results[1]


def centre_uncertainty(case: Case) -> Quantiles | None:
    """Standard uncertainty of the line centre of enantiomer a after one cycle, Hz."""
    if case.nominal.sampled.technique_a.states_splitting:
        return None

    def values(scene: Scene) -> Array:
        real = scene.sampled
        return np.sqrt(real.technique_a.centre_variance(real.line))

    return _plain(case, values, "Hz")


def sensitivity(case: Case) -> Quantiles:
    """Standard uncertainty of the splitting seen times the root of live time, Hz s^0.5, no systematics."""
    return _plain(case, lambda scene: np.sqrt(scene.sampled.noise), "Hz s^0.5")


def required_times(case: Case) -> tuple[RequiredTime, RequiredTime]:
    """Required time on the wall clock and on the live clock."""
    nominal = _number(_required(case.nominal, case.rule))
    wall = _required_quantiles(case, finite(nominal), live=False)
    duty = _number(case.nominal.sampled.averaging.live_per_wall)
    live = _required_quantiles(case, finite(nominal * duty), live=True)
    reachable, in_time = _probabilities(case)
    shared: dict[str, float | None] = {
        "reachable": float(half_width(reachable)), "in_time": float(half_width(in_time)),
    }  # fmt: skip
    return (
        _required_time("wall", wall, float(reachable.mean()), float(in_time.mean()), shared, calculations(case, wall)),
        _required_time("live", live, float(reachable.mean()), float(in_time.mean()), shared, {}),
    )


def _required_time(
    clock: str, found: Quantiles, reachable: float, in_time: float, shared: Mapping[str, float | None],
    per_calculation: Mapping[str, float | None],
) -> RequiredTime:  # fmt: skip
    numbers = {name: getattr(found, name) for name in PROBABILITIES}
    return RequiredTime(
        clock=clock, nominal=found.nominal, reachable=reachable, in_time=in_time,
        error={**found.error, **shared}, per_calculation=per_calculation, **numbers,
    )  # fmt: skip


def _required(scene: Scene, rule: Rule) -> Array:
    return required_wall_time(scene.sampled, rule, scene.signal_drawn)


def _required_quantiles(case: Case, nominal: float | None, live: bool) -> Quantiles:
    def values(scene: Scene) -> Array:
        wall = _required(scene, case.rule)
        return np.asarray(wall * scene.sampled.averaging.live_per_wall) if live else wall

    if not case.integrates:
        return plain(case.full.estimator.sample, values(case.full), "s", nominal)
    rough = plain(case.small.estimator.sample, values(case.small), "s", nominal)
    estimator = case.full.estimator
    return positive(estimator.met_by_live if live else estimator.met_by, rough, "s", nominal)


def _probabilities(case: Case) -> tuple[Array, Array]:
    """P(reachable ever) and P(required time <= budget), per replicate."""
    if case.integrates:
        found = case.full.estimator.met_by(np.array([np.inf, case.budget]))
        return found[0], found[1]
    wall = _required(case.full, case.rule)
    average = case.full.estimator.sample.average
    return average(np.isfinite(wall).astype(float)), average((wall <= case.budget).astype(float))


def theory_groups(case: Case) -> list[tuple[int, tuple[str, ...]]]:
    """The ensemble groups of the scenario's splitting: place among the sample's groups, member names."""
    mine = set(case.full.scenario.splitting.addresses())
    found: dict[int, tuple[str, ...]] = {}
    for one in case.problem.inputs:
        if one.address in mine and isinstance(one.law, Ensemble):
            found[case.full.estimator.sample.groups.index(one.law.group)] = one.law.members
    return sorted(found.items())


def _labels(case: Case) -> list[tuple[int, int, str]]:
    groups = theory_groups(case)
    names = case.full.estimator.sample.groups
    many = len(groups) > 1
    return [
        (group, place, f"{names[group]}: {member}" if many else member)
        for group, members in groups
        for place, member in enumerate(members)
    ]


def calculations(case: Case, found: Quantiles) -> dict[str, float | None]:
    """Median required time if only one of the rival calculations is right."""
    estimator, medians = case.full.estimator, {}
    for group, place, label in _labels(case):

        def one(points: Array, group: int = group, place: int = place) -> Array:
            return estimator.sample.member_average(points, group)[place]

        if case.integrates:
            start = [guesses(found, found.nominal)[2]]
            medians[label] = solve(lambda wall, one=one: estimator.met_by(wall, one), [0.5], start)[0].value
        else:
            wall = np.exp(-_required(case.full, case.rule))  # any falling map keeps infinities apart
            draws, weights = flattened(estimator.sample, wall, only=(group, place))
            middle = of_values(draws, weights, [0.5])[0][0]
            medians[label] = float(-np.log(middle)) if middle > 0 else None
    return medians


def chance_points(case: Case, wall: float) -> Array:
    """Chance at every point: the pivot integrated, or the closed form where everything was drawn."""
    if case.integrates:
        return case.full.estimator.chance_points(np.array([wall]))
    return closed_chance(case.full, case.rule, wall)[None, ...]


def closed_chance(scene: Scene, rule: Rule, wall: float) -> Array:
    """Chance given the drawn signal, by the closed form of the goal."""
    real, at = scene.sampled, np.asarray(wall)
    sigma = np.sqrt(real.averaging.best_variance(at))
    met = chance(rule, scene.signal_drawn, sigma, sigma, real.relative_variance(at))
    return np.asarray(np.where(real.averaging.usable(at), met, 0.0))


def chances(case: Case) -> Chance:
    """The chance within the budget, its ceiling, its range over the calculations."""
    sample = case.full.estimator.sample

    def value(wall: float) -> tuple[float, float]:
        replicates = sample.average(chance_points(case, wall))[0]
        return float(replicates.mean()), float(half_width(replicates))

    goal, points = case.problem.goal, chance_points(case, case.budget)
    per_calculation = {
        label: float(sample.member_average(points, group)[place].mean()) for group, place, label in _labels(case)
    }
    at_each = tuple((Moment(wall), *value(wall)) for wall in goal.within)
    _, found, error = at_each[-1]
    return Chance(
        within=Moment(case.budget), value=found, error=error, ceiling=value(np.inf)[0],
        nominal=_number(closed_chance(case.nominal, case.rule, case.budget)),
        goal_met=None if goal.power is None else found >= goal.power,
        per_calculation=per_calculation, at_each=at_each if len(goal.within) > 1 else (),
    )  # fmt: skip


def ratio(case: Case, divisor: Callable[[Scene], Array], probabilities: list[float]) -> list[float | None]:
    """Quantiles of |signal|/divisor, the divisor taken at every point."""
    sampled = np.abs(case.full.signal_drawn) / divisor(case.full)
    draws, weights = flattened(case.full.estimator.sample, sampled)
    rough, _ = of_values(draws, weights, probabilities)
    if not case.integrates:
        return [finite(value) for value in rough]
    estimator = case.full.estimator
    if estimator.extra:  # the divisor along the pivot's nodes
        nodes = replace(case.full, sampled=estimator.realisation)
        along = divisor(nodes)
    else:
        along = divisor(case.full)
    starts = [value if np.isfinite(value) and value > 0 else 1.0 for value in rough]
    found = solve(lambda value: 1.0 - estimator.ratio_above(along, value), probabilities, starts)
    return [quantile.value for quantile in found]


def sigma_at(scene: Scene, wall: float) -> Array:
    """Standard uncertainty of the splitting seen by a wall time, Hz."""
    return np.asarray(np.sqrt(scene.sampled.averaging.best_variance(np.asarray(wall))))


def significance(case: Case) -> Significance:
    """|splitting seen| over sigma at the budget."""

    def divisor(scene: Scene) -> Array:
        return np.maximum(sigma_at(scene, case.budget), 1e-300)

    q16, q50, q84 = ratio(case, divisor, [0.16, 0.5, 0.84])
    nominal = _number(np.abs(case.nominal.signal_drawn) / divisor(case.nominal))
    freedom = case.nominal.sampled.averaging.degrees_of_freedom(np.asarray(case.budget))
    left = None if q50 is None else finite(_number(surviving_significance(np.asarray(q50), freedom)))
    return Significance(Moment(case.budget), q16, q50, q84, finite(nominal), left)


def sigmas(case: Case) -> Sigma:
    """sigma at the budget in parts, and the nominal shares of its square."""
    budget = np.asarray(case.budget)

    def level(select: Callable[[str], bool]) -> Level:
        def values(scene: Scene) -> Array:
            averaging = scene.sampled.averaging
            parts = averaging.parts(averaging.best_time(budget))
            return np.sqrt(sum((part for name, part in parts.items() if select(name)), np.zeros((1, 1))))

        draws, weights = flattened(case.full.estimator.sample, values(case.full))
        return Level(finite(of_values(draws, weights, [0.5])[0][0]), finite(_number(values(case.nominal))))

    best = case.nominal.sampled.averaging
    parts = {name: _number(part) for name, part in best.parts(best.best_time(budget)).items()}
    total = sum(parts.values())
    return Sigma(
        at=Moment(case.budget), unit="Hz",
        total=level(lambda name: True),
        statistical=level(lambda name: name == "statistics"),
        reference=level(lambda name: name.startswith("reference")),
        systematic=level(lambda name: name.startswith("systematics")),
        shares={name: part / total if total > 0 else 0.0 for name, part in parts.items()},
    )  # fmt: skip


def unit_need(case: Case, scene: Scene) -> Array:
    """Signal over sigma that the goal needs at the budget; infinite where no sigma is small enough."""
    one, relative = np.ones((1, 1)), scene.sampled.relative_variance(np.asarray(case.budget))
    return needed_signal(case.rule, one, one, relative)


def resolution(case: Case) -> Resolution:
    """sigma that the goal needs: of the splitting, of one line centre, as fractions."""

    def level(scale: Callable[[Scene], Array]) -> Level:
        def divisor(scene: Scene) -> Array:
            return unit_need(case, scene) * scale(scene)

        nominal = _number(np.abs(case.nominal.signal_drawn) / divisor(case.nominal))
        return Level(ratio(case, divisor, [0.5])[0], finite(nominal))

    line, technique = case.nominal.sampled.line, case.nominal.sampled.technique_a
    needed = level(lambda scene: np.ones((1, 1)))
    centre = Level(*(None if v is None else v / np.sqrt(2.0) for v in (needed.q50, needed.nominal)))
    frequency = None
    if line.frequency is not None:
        frequency = level(lambda scene: _given(scene.sampled.line.frequency))
    width = None
    if technique.interrogation_width(line) is not None:
        width = level(lambda scene: _given(scene.sampled.technique_a.interrogation_width(scene.sampled.line)))
    return Resolution(needed=needed, needed_centre=centre, of_frequency=frequency, of_fwhm=width)


def _given(values: Array | None) -> Array:
    assert values is not None
    return np.asarray(values)


def reach(case: Case) -> Quantiles:
    """The smallest true splitting that meets the goal within the budget, Hz."""

    def values(scene: Scene) -> Array:
        needed = needed_at(scene.sampled, case.rule, np.asarray(case.budget))
        with np.errstate(divide="ignore"):
            return np.asarray(needed / np.abs(scene.sampled.factor))

    return _plain(case, values, "Hz")


def limit(case: Case) -> Limit:
    """Median over outcomes and inputs of the limit on the true splitting if there is none."""
    rule, budget = case.limit_rule, np.asarray(case.budget)
    real, sample = case.full.sampled, case.full.estimator.sample
    sigma = np.sqrt(real.averaging.best_variance(budget))
    relative, usable = real.relative_variance(budget), real.averaging.usable(budget)

    def below(size: Array) -> Array:
        signal = size.reshape((-1,) + (1,) * (len(sample.groups) + 2)) * np.abs(real.factor)
        return sample.average(np.where(usable, chance(rule, signal, sigma, sigma, relative), 0.0))

    start = _number(np.sqrt(case.nominal.sampled.averaging.best_variance(budget))) * 2.5
    found = solve(below, [0.5], [start if start > 0 else 1e-30])[0]
    return Limit(rule.confidence, str(rule.construction), found.value)


def counted_signal(case: Case, scene: Scene) -> Array:
    """The part of the drawn signal that counts for the goal."""
    return counted(case.rule, scene.signal_drawn)
