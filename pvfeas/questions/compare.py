"""Scenarios side by side: what differs, and the odds that one beats another."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from itertools import combinations

import numpy as np

from pvfeas.conditional import FAR, all_positive
from pvfeas.errors import UsageError
from pvfeas.integration import draws_along, node_axis
from pvfeas.laws import Array
from pvfeas.nominal import nominal_draws
from pvfeas.options import Options
from pvfeas.points import half_width
from pvfeas.problem import Draws, Problem
from pvfeas.questions.assess import Progress, assess
from pvfeas.questions.planning import Plan, Sampling, chosen, samplings
from pvfeas.questions.tolerance import PROBABILITY
from pvfeas.realisation import Realisation, realise
from pvfeas.required import counted, raw_needed, required_wall_time
from pvfeas.results import Assessment, Comparison, Difference, Odds

ENOUGH = 0.05  # of the variance of the ratio of the times
SAME = 1e-9  # relative: signals closer than this to what is needed are the same, and so are the times


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
    for sampling in samplings(problem, options, planned):
        found = [_pair(sampling, *two) for two in combinations(planned, 2)]
        if all(one.error <= PROBABILITY * options.tolerance for one in found):
            break
    return tuple(found)


def _pair(sampling: Sampling, first: Plan, second: Plan) -> Odds:
    lead, other, address = _lead(first, second)
    if sampling.thin is None or not address:
        sample = sampling.full
        margins = _sooner_neither_same(lead, other, sample.draws)
        points = [
            np.asarray(np.all([m > 0 for m in np.broadcast_arrays(*one)], axis=0), dtype=float) for one in margins
        ]
    else:
        sample = sampling.thin
        margins = _sooner_neither_same(lead, other, draws_along(sampling.problem, sample, address))
        points = [all_positive(one, node_axis(sample)) for one in margins]
    sooner, neither, same = (sample.average(one) for one in points)
    later = np.maximum(1.0 - sooner - neither - same, 0.0)
    nominal = [_number(_times(one, one.nominal.sampled, nominal_draws(one.problem.inputs))) for one in (first, second)]
    return Odds(
        first=first.scenario.name,
        second=second.scenario.name,
        first_sooner=float((sooner if lead is first else later).mean()),
        second_sooner=float((later if lead is first else sooner).mean()),
        neither=float(neither.mean()),
        error=max(float(half_width(part)) for part in (sooner, later, neither)),
        nominal_ratio=nominal[1] / nominal[0] if np.all(np.isfinite(nominal)) and nominal[0] > 0 else None,
    )


def _lead(first: Plan, second: Plan) -> tuple[Plan, Plan, str]:
    """The scenario whose own input is integrated, the other one, and that input (empty: none).

    An input of one scenario alone is taken where it carries enough of the spread of the ratio of signal to sigma,
    for the other time then needs to be found only once for each point; else the input with the largest part.
    """
    steps = first.steps
    if steps.real is None or second.steps.real is None:
        return first, second, ""
    logs = [one.steps.margin(one.problem, one.target) for one in (first, second)]
    shares = steps.shares(logs[1] - logs[0])
    alone = [steps.shares(log) for log in logs]
    own = {a: share for a, share in shares.items() if min(one[a] for one in alone) == 0.0}
    address = steps.largest(own)
    if not address or own[address] < ENOUGH:
        address = steps.largest(shares)
    if not address or alone[0][address] >= alone[1][address]:
        return first, second, address
    return second, first, address


def _times(planned: Plan, real: Realisation, draws: Draws) -> Array:
    return required_wall_time(real, planned.rule, real.factor * planned.target.at(draws))


def _sooner_neither_same(lead: Plan, other: Plan, draws: Draws) -> list[list[Array]]:
    """Margins that are all positive where the lead is sooner, both are unreachable, both need the same time.

    The lead is sooner where its signal is more than it needs at the required time of the other, which
    may be infinite; this has no jump where a required time becomes infinite.
    """
    real = {one: realise(one.scenario, draws) for one in (lead, other)}
    signal = {one: real[one].factor * one.target.at(draws) for one in (lead, other)}
    size = {one: counted(one.rule, signal[one]) for one in (lead, other)}
    at = required_wall_time(real[other], other.rule, signal[other])
    ahead, usable = more(size[lead], raw_needed(real[lead], lead.rule, at)), real[lead].averaging.margin(at)
    same = np.where((np.abs(ahead) <= SAME) & (usable > 0) & np.isfinite(at), 1.0, -1.0)
    lacking = [_lacking(real[one], one, size[one]) for one in (lead, other)]
    shape = [np.zeros(np.broadcast_shapes(*(one.shape for one in (ahead, usable, same, *lacking)))) + 1.0]
    return [[np.where(same > 0, -SAME, ahead), usable, *shape], [*lacking, *shape], [same, *shape]]


def _lacking(real: Realisation, one: Plan, size: Array) -> Array:
    """How clearly no time is enough: for want of signal, or of a sample that lasts for one cycle."""
    forever = np.asarray(np.inf)
    short = more(raw_needed(real, one.rule, forever), size)
    return np.asarray(np.maximum(np.where(size <= 0, FAR, short), -real.averaging.margin(forever)))


def more(first: Array, second: Array) -> Array:
    """ln first - ln second for numbers that cannot be negative, cut to what matters; below zero where in doubt."""
    with np.errstate(invalid="ignore", divide="ignore"):
        found = np.log(np.maximum(first, 0.0)) - np.log(np.maximum(second, 0.0))
    return np.asarray(np.clip(np.nan_to_num(found, nan=-FAR, posinf=FAR, neginf=-FAR), -FAR, FAR))


def _number(values: Array) -> float:
    return float(np.asarray(values).reshape(-1)[0])
