"""Everything about each scenario: required time, chance, significance, resolution, reach, limit."""

from __future__ import annotations

from collections.abc import Callable, Collection, Sequence
from dataclasses import asdict, replace
from typing import Any

import numpy as np

from pvfeas.decision import contract
from pvfeas.linear import STEP, adequate, combine, contributions
from pvfeas.nominal import nominal_draws, stepped_draws
from pvfeas.options import Options
from pvfeas.problem import Problem, ScenarioProblem
from pvfeas.questions import sections
from pvfeas.questions.planning import Case, Plan, Sampling, adaptive, chosen, samplings
from pvfeas.questions.reasons import limiting, reason
from pvfeas.questions.tolerance import unmet
from pvfeas.realisation import realise
from pvfeas.required import required_wall_time
from pvfeas.results import Assessment, LinearTime, RequiredTime, ScenarioResult, Warned

Progress = Callable[[str], None]
SINGLE: dict[str, Callable[[Case], Any]] = {
    "centre_uncertainty": sections.centre_uncertainty, "sensitivity": sections.sensitivity,
    "chance": sections.chances, "reach": sections.reach,
}  # fmt: skip


def assess(
    problem: Problem,
    options: Options | None = None,
    names: Sequence[str] = (),
    progress: Progress | None = None,
) -> Assessment:
    """Answer everything about the named scenarios (all if none is named).

    Points double until every number meets its tolerance or the maximum is reached; a number that
    meets it is kept, so that no scenario depends on which others are asked for. Raises UsageError for
    a scenario that the study does not have.
    """
    options = options or Options()
    scenarios = chosen(problem, names)
    planned = [Plan(problem, one) for one in scenarios]
    results: list[ScenarioResult | None] = [None] * len(planned)
    points, met = 0, False
    if options.method == "monte-carlo":
        sampling, met = adaptive(problem, planned, options)
        return _assessment(problem, options, [answer(sampling.case(one)) for one in planned], sampling.points, met)
    for sampling in samplings(problem, options, planned):
        results = [better(sampling, *one, options.tolerance) for one in zip(planned, results, strict=True)]
        points, met = sampling.points, not any(one and unmet(one, options.tolerance) for one in results)
        if progress:
            progress(f"{points} points")
        if met:
            break
    return _assessment(problem, options, [one for one in results if one], points, met)


def _assessment(
    problem: Problem, options: Options, results: Sequence[ScenarioResult], points: int, met: bool
) -> Assessment:
    names = [one.name for one in results]
    scenarios = chosen(problem, names)
    return Assessment(
        question={"name": "assess", "scenarios": names, **asdict(options)},
        title=problem.title, sha256=problem.sha256, seed=options.seed, points=points, method=options.method,
        tolerance_met=met, warnings=tuple(Warned(*one) for one in problem.warnings) + doubts(problem, scenarios),
        scenarios=tuple(results),
    )  # fmt: skip


def better(sampling: Sampling, planned: Plan, before: ScenarioResult | None, tolerance: float) -> ScenarioResult:
    """A scenario's answer on a larger sample: what did not meet its tolerance is computed anew."""
    if before is None:
        return answer(sampling.case(planned))
    missing = unmet(before, tolerance)
    return improved(sampling.case(planned), before, missing) if missing else before


def answer(case: Case) -> ScenarioResult:
    """One scenario on one sample."""
    planned = case.plan
    true, seen = sections.splittings(case)
    wall, live = sections.required_times(case)
    centre = sections.centre_uncertainty(case)
    status, why = reason(case, wall.reachable, wall.q50)
    return ScenarioResult(
        name=planned.scenario.name,
        technique=planned.nominal.sampled.technique_a.kind,
        splitting=true, signal=seen, centre_uncertainty=centre, sensitivity=sections.sensitivity(case),
        required_time=wall, required_live_time=live, chance=sections.chances(case),
        significance=sections.significance(case), sigma=sections.sigmas(case), resolution=sections.resolution(case),
        reach=sections.reach(case), limit=sections.limit(case), linear=linear_time(case.problem, planned, wall),
        contract=contract(planned.rule, planned.scenario.floor_declared, planned.scenario.schedule_declared),
        limiting=limiting(case), status=status, reason=why,
        not_applicable=("centre_uncertainty",) if centre is None else (),
    )  # fmt: skip


def improved(case: Case, before: ScenarioResult, missing: Collection[str]) -> ScenarioResult:
    """The answer with the missing numbers computed on this sample."""
    found: dict[str, Any] = {}
    if {"splitting", "signal"} & set(missing):
        found["splitting"], found["signal"] = sections.splittings(case)
    if {"required_time", "required_live_time"} & set(missing):
        wall, found["required_live_time"] = sections.required_times(case)
        found["required_time"], found["linear"] = wall, linear_time(case.problem, case.plan, wall)
        found["status"], found["reason"] = reason(case, wall.reachable, wall.q50)
    for name, compute in SINGLE.items():
        if name in missing:
            found[name] = compute(case)
    return replace(before, **found)


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
        drawn = scenario.with_width(nominal)
        for template in dict.fromkeys((id(scenario.technique_a), id(scenario.technique_b))):
            part = scenario.technique_a if template == id(scenario.technique_a) else scenario.technique_b
            for code, message in part.at(drawn).warnings(scenario.line.at(drawn)):
                found.append(Warned(code, f"{scenario.name}.technique", message))
    return tuple(dict.fromkeys(found))
