"""Which input is integrated exactly, and the estimators that follow from it."""

from __future__ import annotations

from collections import Counter
from collections.abc import Mapping
from dataclasses import dataclass, replace
from typing import Literal

import numpy as np
from scipy import special

from pvfeas.conditional import NODES, LawPivot, NodePivot, NoPivot, Pivot
from pvfeas.decision import Rule
from pvfeas.estimator import Estimator
from pvfeas.laws import Array
from pvfeas.nominal import stepped_draws
from pvfeas.points import Sample, correlation_root, uncertain_addresses, uniforms
from pvfeas.problem import Ensemble, Expression, Problem, ScenarioProblem
from pvfeas.realisation import Realisation, realise

LEAST_SHARE = 0.1  # of the variance, below which the splitting is not worth integrating


@dataclass(frozen=True)
class Choice:
    """The pivot of a scenario: an input of the splitting, any other input, or none."""

    kind: Literal["law", "node", "none"]
    address: str = ""


def others_of(scenario: ScenarioProblem) -> set[str]:
    """Every input that acts on something else than the splitting's plain factors."""
    templates = (
        scenario.line, scenario.technique_a, scenario.technique_b, scenario.switching, scenario.samples_a,
        scenario.samples_b, scenario.schedule, *scenario.systematics,
    )  # fmt: skip
    found = {address for template in templates for address in template.addresses()}
    for base, exponent in scenario.splitting.powers:
        found |= set(base.addresses()) | set(exponent.addresses())
    return found


def variance_shares(problem: Problem, scenario: ScenarioProblem, signal: Expression) -> Mapping[str, float]:
    """Each input's part of the variance of ln(signal/sigma) at the budget, from steps of one sigma."""
    moved, draws = stepped_draws(problem.inputs, 1.0)
    if not moved:
        return {}
    real = realise(scenario, draws)
    with np.errstate(divide="ignore"):
        margin = np.log(np.abs(signal.at(draws) * real.factor)) - 0.5 * np.log(
            real.averaging.best_variance(np.asarray(problem.goal.within[-1]))
        )
    margin = np.clip(np.nan_to_num(np.broadcast_to(margin, (1, 2 * len(moved)))), -100.0, 100.0)
    change = (margin[0, 1::2] - margin[0, ::2]) / 2.0
    total = float((change**2).sum())
    return {a: float(c**2) / total if total > 0 else 0.0 for a, c in zip(moved, change, strict=True)}


def choose(problem: Problem, scenario: ScenarioProblem, signal: Expression) -> Choice:
    """The splitting's own widest input if it matters, else the input with the largest share."""
    shares = variance_shares(problem, scenario, signal)
    uncertain = set(uncertain_addresses(problem.inputs))
    elsewhere, count = others_of(scenario), Counter(signal.inputs)
    own = [a for a in signal.inputs if a in uncertain and count[a] == 1 and a not in elsewhere]
    best = max(own, key=lambda a: (shares.get(a, 0.0), a), default="")
    if best and shares.get(best, 0.0) >= LEAST_SHARE:
        return Choice("law", best)
    tied = {address for one in problem.correlations for address in one.between}
    ensembles = {one.address for one in problem.inputs if isinstance(one.law, Ensemble)}
    free = [a for a in sorted(uncertain) if a not in tied and a not in ensembles and shares.get(a, 0.0) > 0]
    largest = max(free, key=lambda a: (shares[a], a), default="")
    if largest and shares[largest] > shares.get(best, 0.0):
        return Choice("node", largest)
    return Choice("law", best) if best else Choice("none")


def noise_scores(problem: Problem, name: str, seed: int, exponent: int) -> Array:
    """Normal scores of a scenario's measurement noise: one more input, behind all others."""
    place = sorted(one.name for one in problem.scenarios).index(name)
    dimension = len(uncertain_addresses(problem.inputs)) + place
    return np.asarray(special.ndtri(uniforms(f"noise of {name}", dimension, seed, exponent)))


def law_pivot(problem: Problem, sample: Sample, address: str, factor: Array) -> LawPivot:
    """The pivot for an input that the signal is proportional to."""
    law = next(one.law for one in problem.inputs if one.address == address)
    if isinstance(law, Ensemble):
        return LawPivot(factor, law.laws, axis=sample.groups.index(law.group) - len(sample.groups) - 2)
    location, width = conditional_score(problem, sample, address)
    return LawPivot(factor, (law,), location=location, width=width)


def conditional_score(problem: Problem, sample: Sample, address: str) -> tuple[Array | None, float]:
    """Mean and width of an input's normal score given those of the inputs correlated with it."""
    if not any(address in one.between for one in problem.correlations):
        return None, 1.0
    root = correlation_root(sorted(sample.scores), problem.correlations)
    names = list(root)
    matrix = np.array([[_product(root[a], root[b]) for b in names] for a in names])
    mine = names.index(address)
    rest = [i for i in range(len(names)) if i != mine]
    weights = np.linalg.solve(matrix[np.ix_(rest, rest)], matrix[rest, mine])
    location: Array = np.zeros(())
    for weight, i in zip(weights, rest, strict=True):
        location = location + float(weight) * sample.scores[names[i]]
    left = 1.0 - float((weights * matrix[rest, mine]).sum())
    return location, float(np.sqrt(max(left, 1e-12)))


def _product(first: Mapping[str, float], second: Mapping[str, float]) -> float:
    return sum(first[name] * second[name] for name in first.keys() & second.keys())


@dataclass(frozen=True)
class Scene:
    """A scenario on a sample, ready for every question.

    sampled: everything drawn, the signal included; estimator: the pivot integrated.
    splitting is the pivot of the true splitting itself, None where it was sampled.
    """

    scenario: ScenarioProblem
    sampled: Realisation
    splitting_drawn: Array
    signal_drawn: Array  # what the goal compares with sigma, at every point
    estimator: Estimator
    splitting: Pivot | None
    seen: Pivot | None


def scene(
    problem: Problem, scenario: ScenarioProblem, rule: Rule, choice: Choice, sample: Sample, noise: Array,
    target: Expression,
) -> Scene:  # fmt: skip
    """Realise a scenario on a sample. target: the expression of the signal before dilution."""
    sampled = realise(scenario, sample.draws)
    drawn = scenario.splitting.at(sample.draws)
    signal = sampled.factor * target.at(sample.draws)
    plain = Scene(
        scenario, sampled, drawn, signal, Estimator(rule, sample, sampled, NoPivot(signal), noise), None, None
    )
    if choice.kind == "none":
        return plain
    if choice.kind == "node":
        return replace(plain, estimator=_on_nodes(problem, scenario, rule, choice.address, sample, noise, target))
    without = {**sample.draws, choice.address: np.asarray(1.0)}
    factor = sampled.factor * target.at(without)
    pivot = law_pivot(problem, sample, choice.address, factor)
    own = law_pivot(problem, sample, choice.address, scenario.splitting.at(without))
    seen = law_pivot(problem, sample, choice.address, sampled.factor * scenario.splitting.at(without))
    return replace(plain, estimator=Estimator(rule, sample, sampled, pivot, noise), splitting=own, seen=seen)


def _on_nodes(
    problem: Problem, scenario: ScenarioProblem, rule: Rule, address: str, sample: Sample, noise: Array,
    target: Expression,
) -> Estimator:  # fmt: skip
    law = next(one.law for one in problem.inputs if one.address == address)
    assert not isinstance(law, Ensemble)
    behind = len(sample.groups) + 2
    nodes = law.from_score(NODES).reshape((-1,) + (1,) * behind)
    draws = {**sample.draws, address: nodes}
    real = realise(scenario, draws)
    signal = real.factor * target.at(draws)
    sigma = np.sqrt(real.averaging.best_variance(np.asarray(problem.goal.within[-1])))
    pivot = NodePivot(signal, np.where(sigma > 0, sigma, 1.0), axis=-1 - behind)
    return Estimator(rule, sample, real, pivot, noise, extra=1)
