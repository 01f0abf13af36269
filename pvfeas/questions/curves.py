"""What the figures show: sigma and chance against wall time."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from pvfeas.laws import Array
from pvfeas.options import Options
from pvfeas.points import half_width
from pvfeas.problem import Problem
from pvfeas.quantiles import pooled
from pvfeas.questions.planning import Case, Plan, chosen, samplings
from pvfeas.questions.sections import chance_points, finite, ratio, unit_need
from pvfeas.required import required_wall_time
from pvfeas.results import ChanceCurve, Curves, SigmaCurve
from pvfeas.showing import value_text
from pvfeas.summaries import flattened
from pvfeas.tables import Goal

STEPS_PER_DECADE = 24
LEAST_STEPS = 80  # on the whole axis: a short one shows no corners
LONGEST = 1e10  # s; no figure goes beyond three hundred years


def curves(problem: Problem, names: Sequence[str] = (), options: Options | None = None) -> Curves:
    """Curves of the named scenarios on one sample of the study."""
    options = options or Options()
    planned = [Plan(problem, one) for one in chosen(problem, names)]
    sampling = next(samplings(problem, options, planned))
    cases = [sampling.case(one) for one in planned]
    wall = wall_times(cases)
    return Curves(
        title=problem.title,
        goal=goal_in_words(problem.goal),
        sigma=tuple(_sigma(case, wall) for case in cases),
        chance=tuple(_chance(case, wall) for case in cases),
    )


def wall_times(cases: Sequence[Case]) -> Array:
    """A common logarithmic grid around the required times and the budget, s."""
    marks = [case.budget for case in cases]
    for case in cases:
        times = required_wall_time(case.small.sampled, case.rule, case.small.signal_drawn)
        marks += [t for t in pooled(*flattened(case.small.sample, times), [0.1, 0.5, 0.9]) if 0 < t < LONGEST]
    high = min(max(marks) * 5.0, LONGEST)
    low = min(min(marks), high / 5.0) / 5.0
    first, last = np.floor(np.log10(low)), np.ceil(np.log10(high))
    steps = max(STEPS_PER_DECADE, int(np.ceil(LEAST_STEPS / np.log10(high / low))))
    count = int(last - first) * steps + 1
    grid = np.logspace(first, last, count)
    return np.asarray(grid[(grid > low * 0.9) & (grid < high * 1.1)])


def _sigma(case: Case, wall: Array) -> SigmaCurve:
    averaging = case.nominal.sampled.averaging
    low_band, high_band = [], []
    for at in wall:
        sigma = np.sqrt(case.full.sampled.averaging.variance(np.asarray(at)))
        low, high = pooled(*flattened(case.full.sample, sigma), [0.16, 0.84])
        low_band.append(low)
        high_band.append(high)
    nominal = averaging.parts(wall.reshape(-1, 1, 1))
    parts = {
        name: _row(np.sqrt(np.broadcast_to(part, (len(wall), 1, 1)))) for name, part in nominal.items() if np.any(part)
    }
    need16, need50, need84 = ratio(case, lambda real: unit_need(case, real), [0.16, 0.5, 0.84])
    need = np.abs(case.nominal.signal_drawn) / unit_need(case, case.nominal.sampled)
    left = float(np.sqrt(averaging.best_variance(np.asarray(np.inf))).reshape(-1)[0])
    crossing = required_wall_time(case.nominal.sampled, case.rule, case.nominal.signal_drawn)
    return SigmaCurve(
        scenario=case.full.scenario.name,
        unit="Hz",
        wall_time=tuple(float(at) for at in wall),
        total=_row(np.sqrt(np.broadcast_to(averaging.variance(wall.reshape(-1, 1, 1)), (len(wall), 1, 1)))),
        total_q16=tuple(low_band),
        total_q84=tuple(high_band),
        parts=parts,
        floor=left if left > 0 else None,
        needed_q16=need16,
        needed_q50=need50,
        needed_q84=need84,
        needed_nominal=finite(float(need.reshape(-1)[0])),
        crossing=finite(float(crossing.reshape(-1)[0])),
        first=float(np.reshape(averaging.first, -1)[0]),
        last=finite(float(np.reshape(averaging.last, -1)[0])),
    )


def _chance(case: Case, wall: Array) -> ChanceCurve:
    sample = case.full.estimator.sample
    values, errors = [], []
    for at in (*wall, case.budget, np.inf):
        replicates = sample.average(chance_points(case, float(at)))[0]
        values.append(float(replicates.mean()))
        errors.append(float(half_width(replicates)))
    return ChanceCurve(
        scenario=case.full.scenario.name,
        wall_time=tuple(float(at) for at in wall),
        chance=tuple(values[:-2]),
        error=tuple(errors[:-2]),
        ceiling=values[-1],
        budget=case.budget,
        at_budget=values[-2],
        power=case.problem.goal.power,
    )


def _row(values: Array) -> tuple[float, ...]:
    return tuple(float(value) for value in np.reshape(values, -1))


def goal_in_words(goal: Goal) -> str:
    """The goal as one phrase."""
    power = "" if goal.power is None else f" with {100 * goal.power:.3g} % power"
    if goal.kind == "measure":
        return f"measure the splitting to {100 * (goal.relative_uncertainty or 0.0):.3g} %"
    if goal.kind == "exclude":
        what = "the predicted splitting" if goal.limit is None else f"a splitting of {value_text(goal.limit, 'Hz')}"
        return f"exclude {what} at {100 * goal.confidence:.4g} % confidence{power}"
    what = "the sign of the splitting" if goal.kind == "sign" else "the splitting"
    return f"detect {what} at {goal.significance:.3g} sigma{power}"
