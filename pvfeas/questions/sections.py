"""The parts of a scenario's answer, each from the scene it was drawn in."""

from __future__ import annotations

from collections.abc import Callable, Mapping

import numpy as np

from pvfeas.decision import Rule, chance, needed_signal
from pvfeas.integration import Scene
from pvfeas.laws import Array
from pvfeas.points import half_width
from pvfeas.problem import Ensemble
from pvfeas.quantiles import pooled, solve
from pvfeas.questions.planning import Case
from pvfeas.realisation import Realisation
from pvfeas.required import counted, raw_needed, required_wall_time
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
from pvfeas.summaries import PROBABILITIES, flattened, guesses, plain, positive, rough, scaled, signed
from pvfeas.systematics import surviving_significance


def _number(values: Array) -> float:
    return float(np.asarray(values).reshape(-1)[0])


def finite(value: float) -> float | None:
    """None for what is not a finite number."""
    return value if np.isfinite(value) else None


def spread(
    case: Case, values: Callable[[Realisation], Array], unit: str, allowed: Callable[[Realisation], Array] | None = None
) -> Quantiles:
    """Quantiles of a quantity that cannot be negative, the input that matters most for it integrated.

    allowed: positive where the quantity is finite; None where it always is.
    """
    smooth = values
    if allowed is not None:

        def values(real: Realisation) -> Array:
            return np.asarray(np.where(allowed(real) > 0, smooth(real), np.inf))

    nominal = finite(_number(values(case.nominal.sampled)))
    address = case.plan.widest(smooth)
    if case.along is None or not address:
        return plain(case.full.sample, values(case.full.sampled), unit, nominal)
    start = rough(case.small.sample, values(case.small.sampled), unit, nominal)
    return positive(case.along.up_to(address, smooth, allowed), start, unit, nominal)


def _true(scene: Scene) -> Array:
    return scene.splitting_drawn


def _seen(scene: Scene) -> Array:
    return scene.sampled.factor * scene.splitting_drawn


def splittings(case: Case) -> tuple[Quantiles, Quantiles]:
    """The true splitting and the splitting seen, Hz, signed."""
    results = []
    for pivot, values in ((case.full.splitting, _true), (case.full.seen, _seen)):
        nominal = finite(_number(values(case.nominal)))
        if pivot is None:
            found = plain(case.full.sample, values(case.full), "Hz", nominal)
        else:
            start = rough(case.small.sample, values(case.small), "Hz", nominal)
            found = signed(case.full.sample, pivot, start, "Hz", nominal or 0.0)
        results.append(found)
    return results[0], results[1]


def centre_uncertainty(case: Case) -> Quantiles | None:
    """Standard uncertainty of the line centre of enantiomer a after one cycle, Hz."""
    if case.nominal.sampled.technique_a.states_splitting:
        return None

    return spread(case, lambda real: np.sqrt(real.technique_a.centre_variance(real.line)), "Hz")


def sensitivity(case: Case) -> Quantiles:
    """Standard uncertainty of the splitting seen at the budget × root of live time, Hz s^0.5, no systematics."""
    budget = np.asarray(case.budget)
    return spread(case, lambda real: np.sqrt(real.averaging.noise_level(budget)), "Hz s^0.5")


def required_times(case: Case) -> tuple[RequiredTime, RequiredTime]:
    """Required time on the wall clock and on the live clock."""
    nominal = _number(_required(case.nominal, case.rule))
    wall = _required_quantiles(case, finite(nominal))
    live = _live(case, wall, nominal)
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


def _required_quantiles(case: Case, nominal: float | None) -> Quantiles:
    if not case.integrates:
        return plain(case.full.sample, _required(case.full, case.rule), "s", nominal)
    start = rough(case.small.sample, _required(case.small, case.rule), "s", nominal)
    return positive(case.full.estimator.met_by, start, "s", nominal)


def _live(case: Case, wall: Quantiles, nominal: float) -> Quantiles:
    """Quantiles on the live clock: those of the wall clock scaled, where one number scales them."""
    duty = case.full.sampled.averaging.live_per_wall
    middle = _number(case.nominal.sampled.averaging.live_per_wall)
    if duty.size == 1:
        return scaled(wall, middle)
    if not case.integrates:
        return plain(case.full.sample, _required(case.full, case.rule) * duty, "s", finite(nominal * middle))
    return positive(case.full.estimator.met_by_live, scaled(wall, middle), "s", finite(nominal * middle))


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
    medians: dict[str, float | None] = {}
    for group, place, label in _labels(case):
        if case.integrates:
            start = [guesses(found, found.nominal)[2]]
            medians[label] = solve(case.full.estimator.only(group, place).met_by, [0.5], start)[0].value
        else:
            draws, weights = flattened(case.full.sample, _required(case.full, case.rule), only=(group, place))
            medians[label] = finite(pooled(draws, weights, [0.5])[0])
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


def ratio(case: Case, divisor: Callable[[Realisation], Array], probabilities: list[float]) -> list[float | None]:
    """Quantiles of |signal|/divisor, the divisor taken at every point."""
    drawn = case.small if case.integrates else case.full
    first = pooled(*flattened(drawn.sample, np.abs(drawn.signal_drawn) / divisor(drawn.sampled)), probabilities)
    if not case.integrates:
        return [finite(value) for value in first]
    estimator = case.full.estimator
    along = divisor(estimator.realisation)
    starts = [value if np.isfinite(value) and value > 0 else 1.0 for value in first]
    found = solve(lambda value: 1.0 - estimator.ratio_above(along, value), probabilities, starts)
    return [quantile.value for quantile in found]


def sigma_at(real: Realisation, wall: float) -> Array:
    """Standard uncertainty of the splitting seen by a wall time, Hz."""
    return np.asarray(np.sqrt(real.averaging.best_variance(np.asarray(wall))))


def significance(case: Case) -> Significance:
    """|splitting seen| over sigma at the budget."""

    def divisor(real: Realisation) -> Array:
        return np.maximum(sigma_at(real, case.budget), 1e-300)

    q16, q50, q84 = ratio(case, divisor, [0.16, 0.5, 0.84])
    nominal = _number(np.abs(case.nominal.signal_drawn) / divisor(case.nominal.sampled))
    freedom = case.nominal.sampled.averaging.degrees_of_freedom(np.asarray(case.budget))
    left = None if q50 is None else finite(_number(surviving_significance(np.asarray(q50), freedom)))
    return Significance(Moment(case.budget), q16, q50, q84, finite(nominal), left)


def sigmas(case: Case) -> Sigma:
    """sigma at the budget in parts, and the nominal shares of its square."""
    budget = np.asarray(case.budget)

    drawn = case.full.sampled.averaging
    parts_drawn = drawn.parts(drawn.best_time(budget))

    best = case.nominal.sampled.averaging
    parts = {name: _number(part) for name, part in best.parts(best.best_time(budget)).items()}
    total = sum(parts.values())

    def level(select: Callable[[str], bool]) -> Level:
        names = [name for name in parts if select(name)]
        values = np.sqrt(sum((parts_drawn[name] for name in names), np.zeros((1, 1))))
        middle = pooled(*flattened(case.full.sample, values), [0.5])[0]
        return Level(finite(middle), finite(float(np.sqrt(sum(parts[name] for name in names)))))

    return Sigma(
        at=Moment(case.budget), unit="Hz",
        total=level(lambda name: True),
        statistical=level(lambda name: name == "statistics"),
        reference=level(lambda name: name.startswith("reference")),
        systematic=level(lambda name: name.startswith("systematics")),
        shares={name: part / total if total > 0 else 0.0 for name, part in parts.items()},
    )  # fmt: skip


def unit_need(case: Case, real: Realisation) -> Array:
    """Signal over sigma that the goal needs at the budget; infinite where no sigma is small enough."""
    one, relative = np.ones((1, 1)), real.relative_variance(np.asarray(case.budget))
    return needed_signal(case.rule, one, one, relative)


def resolution(case: Case) -> Resolution:
    """sigma that the goal needs: of the splitting, of one line centre, as fractions."""

    needed = Level(
        ratio(case, lambda real: unit_need(case, real), [0.5])[0],
        finite(_number(np.abs(case.nominal.signal_drawn) / unit_need(case, case.nominal.sampled))),
    )

    def fraction(scale: Callable[[Realisation], Array]) -> Level:
        nominal = _number(scale(case.nominal.sampled))
        if scale(case.full.sampled).size == 1:
            return Level(*(None if one is None else one / nominal for one in (needed.q50, needed.nominal)))
        middle = ratio(case, lambda real: unit_need(case, real) * scale(real), [0.5])[0]
        return Level(middle, None if needed.nominal is None else needed.nominal / nominal)

    line, technique = case.nominal.sampled.line, case.nominal.sampled.technique_a
    centre = Level(*(None if v is None else v / np.sqrt(2.0) for v in (needed.q50, needed.nominal)))
    frequency = None if line.frequency is None else fraction(lambda real: _given(real.line.frequency))
    width = None
    if technique.interrogation_width(line) is not None:
        width = fraction(lambda real: _given(real.technique_a.interrogation_width(real.line)))
    return Resolution(needed=needed, needed_centre=centre, of_frequency=frequency, of_fwhm=width)


def _given(values: Array | None) -> Array:
    assert values is not None
    return np.asarray(values)


def reach(case: Case) -> Quantiles:
    """The smallest true splitting that meets the goal within the budget, Hz."""

    def values(real: Realisation) -> Array:
        needed = raw_needed(real, case.rule, np.asarray(case.budget))
        with np.errstate(divide="ignore"):
            return np.asarray(needed / np.abs(real.factor))

    return spread(case, values, "Hz", lambda real: real.averaging.margin(np.asarray(case.budget)))


def limit(case: Case) -> Limit:
    """Median over outcomes and inputs of the limit on the true splitting if there is none."""
    rule, budget = case.plan.limit_rule, np.asarray(case.budget)
    real, sample = case.full.sampled, case.full.sample
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
