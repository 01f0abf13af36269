"""Scenarios side by side: what differs, and the odds that one beats another."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from itertools import combinations

import numpy as np

from pvfeas.errors import UsageError
from pvfeas.laws import Array
from pvfeas.options import Options
from pvfeas.points import Sample, half_width
from pvfeas.problem import Problem
from pvfeas.questions.assess import Plan, Progress, assess, chosen, plan, samples
from pvfeas.questions.tolerance import PROBABILITY
from pvfeas.required import required_wall_time
from pvfeas.results import Assessment, Comparison, Difference, Odds

SAME = 1e-9  # relative: two required times closer than this are equal


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
    planned = [plan(problem, one) for one in chosen(problem, names)]
    found: list[Odds] = []
    for sample, _, _ in samples(problem, options):
        times = [_times(problem, one, sample) for one in planned]
        found = [_pair(sample, *two) for two in combinations(list(zip(planned, times, strict=True)), 2)]
        if all(one.error <= PROBABILITY * options.tolerance for one in found):
            break
    return tuple(found)


def _times(problem: Problem, planned: Plan, sample: Sample) -> Array:
    scene = planned.on(problem, sample, np.zeros((1, 1)), plain=True)
    return required_wall_time(scene.sampled, planned.rule, scene.signal_drawn)


def _pair(sample: Sample, first: tuple[Plan, Array], second: tuple[Plan, Array]) -> Odds:
    one, other = first[1], second[1]
    with np.errstate(invalid="ignore"):
        same = np.abs(one - other) <= SAME * np.minimum(one, other)
    neither = np.isinf(one) & np.isinf(other)
    sooner = (one < other) & ~same
    later = (other < one) & ~same
    parts = [sample.average(np.asarray(which, dtype=float)) for which in (sooner, later, neither)]
    nominal = [_nominal(plan_) for plan_ in (first[0], second[0])]
    ratio = nominal[1] / nominal[0] if np.all(np.isfinite(nominal)) and nominal[0] > 0 else None
    return Odds(
        first=first[0].scenario.name,
        second=second[0].scenario.name,
        first_sooner=float(parts[0].mean()),
        second_sooner=float(parts[1].mean()),
        neither=float(parts[2].mean()),
        error=max(float(half_width(part)) for part in parts),
        nominal_ratio=ratio,
    )


def _nominal(planned: Plan) -> float:
    time = required_wall_time(planned.nominal.sampled, planned.rule, planned.nominal.signal_drawn)
    return float(time.reshape(-1)[0])
