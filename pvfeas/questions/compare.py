"""Scenarios side by side: what differs, and the odds that one beats another."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from itertools import combinations

import numpy as np

from pvfeas.conditional import along_nodes, excess
from pvfeas.errors import UsageError
from pvfeas.integration import draws_along, node_axis
from pvfeas.laws import Array
from pvfeas.nominal import nominal_draws
from pvfeas.options import Options
from pvfeas.points import Sample, half_width
from pvfeas.problem import Draws, Problem
from pvfeas.questions.assess import Progress, assess
from pvfeas.questions.planning import Plan, Sampling, chosen, samplings
from pvfeas.questions.tolerance import PROBABILITY
from pvfeas.realisation import Realisation, realise
from pvfeas.required import counted, needed_at, required_wall_time
from pvfeas.results import Assessment, Comparison, Difference, Odds

SAME = 1e-9  # relative: two required times closer than this are equal
TINY = 1e-300


def compare(
    problem: Problem,
    names: Sequence[str] = (),
    options: Options | None = None,
    differences: tuple[Difference, ...] = (),
    progress: Progress | None = None,
) -> Comparison:
    """Assess the named scenarios and the odds of each pair, on the same draws.

    differences are found where the study's text is known and travel with the result.
    Raises UsageError where there are fewer than two scenarios.
    """
    options = options or Options()
    if len(chosen(problem, names)) < 2:
        raise UsageError("compare needs at least two scenarios; use assess for one")
    answer: Assessment = assess(problem, options, names, progress)
    assessment = replace(answer, question={**answer.question, "name": "compare"})
    return Comparison(assessment, differences, odds(problem, names, options))


def odds(problem: Problem, names: Sequence[str], options: Options) -> tuple[Odds, ...]:
    """For each pair, the probability that one needs less wall time; joint draws, points doubling."""
    planned = [Plan(problem, one) for one in chosen(problem, names)]
    found: list[Odds] = []
    for sampling in samplings(problem, options):
        found = [_pair(sampling, *two) for two in combinations(planned, 2)]
        if all(one.error <= PROBABILITY * options.tolerance for one in found):
            break
    return tuple(found)


def _pair(sampling: Sampling, first: Plan, second: Plan) -> Odds:
    sample, margins = _margins(sampling, first, second)
    parts = [sample.average(one) for one in margins]
    nominal = [_number(_times(one, one.nominal.sampled, nominal_draws(one.problem.inputs))) for one in (first, second)]
    return Odds(
        first=first.scenario.name,
        second=second.scenario.name,
        first_sooner=float(parts[0].mean()),
        second_sooner=float(parts[1].mean()),
        neither=float(parts[2].mean()),
        error=max(float(half_width(part)) for part in parts),
        nominal_ratio=nominal[1] / nominal[0] if np.all(np.isfinite(nominal)) and nominal[0] > 0 else None,
    )


def _margins(sampling: Sampling, first: Plan, second: Plan) -> tuple[Sample, list[Array]]:
    """The sample, and at each of its points the probabilities: first sooner, second sooner, both unreachable.

    The input that matters most for the ratio of the times is integrated, as in NodePivot.
    """
    address = _widest(first, second)
    if sampling.thin is None or not address:
        return sampling.full, [np.asarray(one > 0, dtype=float) for one in _ordered(first, second, sampling.full.draws)]
    sample = sampling.thin
    margins = _ordered(first, second, draws_along(sampling.problem, sample, address))
    return sample, [along_nodes(one > 0, one.__getitem__, node_axis(sample)) for one in margins]


def _widest(first: Plan, second: Plan) -> str:
    steps = first.steps
    if steps.real is None or second.steps.real is None:
        return ""
    times = [np.log(_times(one, one.steps.real, steps.draws)) for one in (first, second) if one.steps.real is not None]
    with np.errstate(invalid="ignore"):
        return steps.largest(steps.shares(times[1] - times[0]))


def _times(planned: Plan, real: Realisation, draws: Draws) -> Array:
    return required_wall_time(real, planned.rule, real.factor * planned.target.at(draws))


def _ordered(first: Plan, second: Plan, draws: Draws) -> list[Array]:
    """Three margins, positive where the first is sooner, where the second is, where both are unreachable."""
    times, lacking = [], []
    for one in (first, second):
        real = realise(one.scenario, draws)
        signal = real.factor * one.target.at(draws)
        times.append(required_wall_time(real, one.rule, signal))
        floor = needed_at(real, one.rule, np.asarray(np.inf))
        lacking.append(np.where(np.isinf(times[-1]), np.maximum(excess(floor, counted(one.rule, signal)), TINY), -1.0))
    one, other = times
    sooner, later = (np.where(np.abs(x) <= SAME, -TINY, x) for x in (excess(other, one), excess(one, other)))
    return [sooner, later, np.minimum(*lacking)]


def _number(values: Array) -> float:
    return float(np.asarray(values).reshape(-1)[0])
