"""Everything about each scenario: required time, chance, significance, resolution, reach, limit."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import asdict

import numpy as np

from pvfeas.decision import Rule, contract, limit_rule_for, rule_for
from pvfeas.errors import UsageError
from pvfeas.integration import Choice, Scene, choose, noise_scores, scene
from pvfeas.laws import Array
from pvfeas.linear import STEP, adequate, combine, contributions
from pvfeas.monte_carlo import pseudo_random_samples
from pvfeas.nominal import nominal_draws, stepped_draws
from pvfeas.options import Options
from pvfeas.points import REPLICATES, Sample, draw
from pvfeas.problem import Expression, Problem, ScenarioProblem
from pvfeas.questions import sections
from pvfeas.questions.reasons import limiting, reason
from pvfeas.questions.sections import Case
from pvfeas.questions.tolerance import unmet
from pvfeas.realisation import realise
from pvfeas.required import required_wall_time
from pvfeas.results import Assessment, LinearTime, RequiredTime, ScenarioResult, Warned

FIRST, SMALL = 8, 5  # exponents of two: points per replicate to begin with, and for first guesses
Progress = Callable[[str], None]


def assess(
    problem: Problem,
    options: Options | None = None,
    names: Sequence[str] = (),
    progress: Progress | None = None,
) -> Assessment:
    """Answer everything about the named scenarios (all if none is named).

    Points double, for all scenarios together, until every shown number meets its tolerance or
    the maximum is reached. Raises UsageError for a scenario that the study does not have.
    """
    options = options or Options()
    scenarios = chosen(problem, names)
    planned = [plan(problem, one) for one in scenarios]
    results: list[ScenarioResult] = []
    points, met = 0, False
    for sample, noise_of, small in samples(problem, options):
        results = [answer(problem, one, sample, noise_of(one.scenario.name), small) for one in planned]
        points = sample.shape[0] * sample.shape[1]
        met = not any(unmet(result, options.tolerance) for result in results)
        if progress:
            progress(f"{points} points")
        if met:
            break
    return Assessment(
        question={"name": "assess", "scenarios": [one.name for one in scenarios], **asdict(options)},
        title=problem.title, sha256=problem.sha256, seed=options.seed, points=points, method=options.method,
        tolerance_met=met, warnings=tuple(Warned(*one) for one in problem.warnings) + doubts(problem, scenarios),
        scenarios=tuple(results),
    )  # fmt: skip


def chosen(problem: Problem, names: Sequence[str]) -> tuple[ScenarioProblem, ...]:
    """The named scenarios in the order asked for, or all of them."""
    known = {one.name: one for one in problem.scenarios}
    unknown = [name for name in names if name not in known]
    if unknown:
        raise UsageError(f"no scenario is called {unknown[0]!r}; the study has {', '.join(known)}")
    return tuple(known[name] for name in dict.fromkeys(names)) if names else problem.scenarios


class Plan:
    """What is settled about a scenario before anything is drawn."""

    def __init__(self, problem: Problem, scenario: ScenarioProblem) -> None:
        nominal = nominal_draws(problem.inputs)
        sign = float(np.sign(scenario.splitting.at(nominal).reshape(-1)[0])) or 1.0
        self.scenario = scenario
        self.rule: Rule = rule_for(problem.goal, sign)
        self.limit_rule: Rule = limit_rule_for(problem.goal, sign)
        self.target = target_of(problem, scenario)
        self.choice: Choice = choose(problem, scenario, self.target)
        sample = Sample(nominal, {}, (), (), (1, 1))
        self.nominal = scene(problem, scenario, self.rule, Choice("none"), sample, np.zeros((1, 1)), self.target)

    def on(self, problem: Problem, sample: Sample, noise: Array, plain: bool) -> Scene:
        """The scenario on a sample; plain: nothing is integrated exactly."""
        choice = Choice("none") if plain else self.choice
        return scene(problem, self.scenario, self.rule, choice, sample, noise, self.target)


def plan(problem: Problem, scenario: ScenarioProblem) -> Plan:
    """Settle the rules, the target and the pivot of a scenario."""
    return Plan(problem, scenario)


def target_of(problem: Problem, scenario: ScenarioProblem) -> Expression:
    """What the goal compares with sigma before dilution: the splitting, or the limit asked for."""
    if problem.goal.kind == "exclude" and problem.goal.limit is not None:
        return Expression(float(problem.goal.limit))
    return scenario.splitting


Noise = Callable[[str], Array]


def samples(problem: Problem, options: Options) -> Iterator[tuple[Sample, Noise, Sample | None]]:
    """Ever larger samples of the study, with the noise of each scenario and a small one for first guesses.

    The Monte-Carlo method (JCGM 101:2008, 7.9) integrates nothing exactly: no small sample.
    """
    if options.method == "monte-carlo":
        for sample in pseudo_random_samples(problem, options):
            yield sample, (lambda name: np.zeros((1, 1))), None
        return
    small = draw(problem.inputs, problem.correlations, options.seed, SMALL)
    exponent = FIRST
    while True:
        sample = draw(problem.inputs, problem.correlations, options.seed, exponent)
        yield sample, (lambda name, e=exponent: noise_scores(problem, name, options.seed, e)), small
        exponent += 1
        if 2**exponent > options.maximum_points:
            return


def answer(problem: Problem, planned: Plan, sample: Sample, noise: Array, small: Sample | None) -> ScenarioResult:
    """One scenario on one sample."""
    full = planned.on(problem, sample, noise, plain=small is None)
    rough = planned.on(problem, small or sample, np.zeros((1, 1)), plain=True)
    case = Case(problem, planned.rule, planned.limit_rule, full, rough, planned.nominal)
    true, seen = sections.splittings(case)
    wall, live = sections.required_times(case)
    centre = sections.centre_uncertainty(case)
    limits = limiting(case)
    status, why = reason(case, wall.reachable, wall.q50)
    return ScenarioResult(
        name=planned.scenario.name,
        technique=planned.nominal.sampled.technique_a.kind,
        splitting=true, signal=seen, centre_uncertainty=centre, sensitivity=sections.sensitivity(case),
        required_time=wall, required_live_time=live, chance=sections.chances(case),
        significance=sections.significance(case), sigma=sections.sigmas(case), resolution=sections.resolution(case),
        reach=sections.reach(case), limit=sections.limit(case), linear=linear_time(problem, planned, wall),
        contract=contract(planned.rule, planned.scenario.floor_declared, planned.scenario.schedule_declared),
        limiting=limits, status=status, reason=why,
        not_applicable=("centre_uncertainty",) if centre is None else (),
    )  # fmt: skip


def linear_time(problem: Problem, planned: Plan, wall: RequiredTime) -> LinearTime:
    """Required time by the linear law on ln t; null where the nominal study is unreachable."""
    if wall.nominal is None or wall.nominal <= 0.0:
        return LinearTime(None, None, None)
    moved, draws = stepped_draws(problem.inputs, STEP)
    if not moved:
        return LinearTime(wall.nominal, 0.0, adequate(float(np.log(wall.nominal)), 0.0, wall.q05, wall.q95))
    real = realise(planned.scenario, draws)
    times = required_wall_time(real, planned.rule, real.factor * planned.target.at(draws))
    times = np.broadcast_to(times, (1, 2 * len(moved)))[0]
    if not np.all(np.isfinite(times)):
        return LinearTime(None, None, None)
    u_ln = combine(contributions(problem.inputs, np.log(times), moved), moved, problem.correlations)
    return LinearTime(wall.nominal, u_ln, adequate(float(np.log(wall.nominal)), u_ln, wall.q05, wall.q95))


def doubts(problem: Problem, scenarios: Sequence[ScenarioProblem]) -> tuple[Warned, ...]:
    """Doubts that the techniques have about themselves at the nominal values."""
    nominal = nominal_draws(problem.inputs)
    found = []
    for scenario in scenarios:
        for template in dict.fromkeys((id(scenario.technique_a), id(scenario.technique_b))):
            part = scenario.technique_a if template == id(scenario.technique_a) else scenario.technique_b
            for code, message in part.at(nominal).warnings(scenario.line.at(nominal)):
                found.append(Warned(code, f"{scenario.name}.technique", message))
    return tuple(dict.fromkeys(found))


__all__ = ["REPLICATES", "assess"]
