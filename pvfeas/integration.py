"""Which input is integrated exactly, and the estimators that follow from it."""

from __future__ import annotations

from collections import Counter
from collections.abc import Callable, Mapping
from dataclasses import dataclass, replace
from typing import Any, Literal

import numpy as np
from scipy import special

from pvfeas.conditional import NODES, LawPivot, NodePivot, NodeValues, NoPivot, Pivot
from pvfeas.decision import Rule
from pvfeas.estimator import Estimator
from pvfeas.laws import Array
from pvfeas.nominal import stepped_draws
from pvfeas.points import Sample, correlation_root, uncertain_addresses, uniforms
from pvfeas.problem import Draws, Ensemble, Expression, Problem, ScenarioProblem, Template
from pvfeas.realisation import Realisation, realise

LEAST_SHARE = 0.1  # of the variance, below which the splitting is not worth integrating


@dataclass(frozen=True)
class Choice:
    """The pivot of a scenario: an input of the splitting, any other input, or none."""

    kind: Literal["law", "node", "none"]
    address: str = ""


def others_of(scenario: ScenarioProblem) -> set[str]:
    """Every input that acts on something else than the splitting's plain factors."""
    templates: tuple[Template[Any], ...] = (
        scenario.line, scenario.technique_a, scenario.technique_b, scenario.switching, scenario.samples_a,
        scenario.samples_b, scenario.schedule, *scenario.systematics, *scenario.references,
    )  # fmt: skip
    found = {address for template in templates for address in template.addresses()}
    for base, exponent in scenario.splitting.powers:
        found |= set(base.addresses()) | set(exponent.addresses())
    return found


class Steps:
    """A scenario with one input at a time moved by one sigma, minus and plus: which input matters for what.

    Of an ensemble only the spread within its members counts: the members are enumerated anyway.
    """

    def __init__(self, problem: Problem, scenario: ScenarioProblem) -> None:
        self.moved, self.draws = stepped_draws(problem.inputs, 1.0, between=False)
        self.real: Realisation | None = realise(scenario, self.draws) if self.moved else None
        self._ensembles = {one.address for one in problem.inputs if isinstance(one.law, Ensemble)}

    def shares(self, logarithm: Array) -> Mapping[str, float]:
        """Each input's part of the variance of a quantity, from its logarithm at the steps."""
        kept = np.clip(np.nan_to_num(np.broadcast_to(logarithm, (1, 2 * len(self.moved)))), -100.0, 100.0)
        change = (kept[0, 1::2] - kept[0, ::2]) / 2.0
        total = float((change**2).sum())
        return {a: float(c**2) / total if total > 0 else 0.0 for a, c in zip(self.moved, change, strict=True)}

    def largest(self, shares: Mapping[str, float]) -> str:
        """The input with the largest share, ensembles apart; empty where no input has one."""
        free = [a for a in sorted(shares) if a not in self._ensembles and shares[a] > 0]
        return max(free, key=lambda a: (shares[a], a), default="")

    def margin(self, problem: Problem, signal: Expression) -> Array:
        """ln(|signal seen|/sigma) at the budget at every step."""
        if self.real is None:
            return np.zeros((1, 0))
        sigma = 0.5 * np.log(self.real.averaging.best_variance(np.asarray(problem.goal.within[-1])))
        with np.errstate(divide="ignore"):
            return np.asarray(np.log(np.abs(signal.at(self.draws) * self.real.factor)) - sigma)


def choose(problem: Problem, scenario: ScenarioProblem, signal: Expression, steps: Steps) -> Choice:
    """The splitting's own widest input if it matters, else the input with the largest share."""
    shares = steps.shares(steps.margin(problem, signal))
    uncertain = set(uncertain_addresses(problem.inputs))
    elsewhere, count = others_of(scenario), Counter(signal.inputs)
    own = [a for a in signal.inputs if a in uncertain and count[a] == 1 and a not in elsewhere]
    best = max(own, key=lambda a: (shares.get(a, 0.0), a), default="")
    if best and shares.get(best, 0.0) >= LEAST_SHARE:
        return Choice("law", best)
    largest = steps.largest(shares)
    if largest and shares[largest] > shares.get(best, 0.0):
        return Choice("node", largest)
    return Choice("law", best) if best else Choice("none")


def own_input(problem: Problem, scenario: ScenarioProblem, steps: Steps) -> str:
    """The widest input that the true splitting is proportional to and the purity does not depend on; empty if none."""
    if steps.real is None:
        return ""
    uncertain, count = set(uncertain_addresses(problem.inputs)), Counter(scenario.splitting.inputs)
    bent = {a for pair in scenario.splitting.powers for one in pair for a in one.addresses()}
    bent |= {a for one in (scenario.samples_a, scenario.samples_b) for a in one.addresses()}
    with np.errstate(divide="ignore"):
        shares = steps.shares(np.log(np.abs(scenario.splitting.at(steps.draws))))
    own = [a for a in scenario.splitting.inputs if a in uncertain and count[a] == 1 and a not in bent]
    return max(own, key=lambda a: (shares.get(a, 0.0), a), default="")


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
class Points:
    """Samples of one size: all points, and a thin one for what is integrated along nodes.

    noise, thin_noise: normal scores of the scenario's measurement noise on them.
    """

    full: Sample
    noise: Array
    thin: Sample
    thin_noise: Array


@dataclass(frozen=True)
class Scene:
    """A scenario on a sample, ready for every question.

    sampled: everything drawn, the signal included; estimator: the pivot integrated, perhaps on a
    thinner sample. splitting is the pivot of the true splitting itself, None where it was sampled.
    """

    scenario: ScenarioProblem
    sample: Sample
    sampled: Realisation
    splitting_drawn: Array
    signal_drawn: Array  # what the goal compares with sigma, at every point
    estimator: Estimator
    splitting: Pivot | None = None
    seen: Pivot | None = None


def drawn_scene(
    scenario: ScenarioProblem, rule: Rule, sample: Sample, target: Expression, noise: Array | None = None
) -> Scene:
    """A scenario on a sample with nothing integrated. target: the expression of the signal before dilution."""
    sampled = realise(scenario, sample.draws)
    signal = sampled.factor * target.at(sample.draws)
    estimator = Estimator(rule, sample, sampled, NoPivot(signal), np.zeros((1, 1)) if noise is None else noise)
    return Scene(scenario, sample, sampled, scenario.splitting.at(sample.draws), signal, estimator)


def integrated_scene(
    problem: Problem, scenario: ScenarioProblem, rule: Rule, choice: Choice, points: Points, target: Expression,
    own: str,
) -> Scene:  # fmt: skip
    """A scenario on a sample with the chosen input integrated; own: the input integrated for the splitting itself."""
    plain = drawn_scene(scenario, rule, points.full, target, points.noise)
    if own:
        without = {**points.full.draws, own: np.asarray(1.0)}
        factor = scenario.splitting.at(without)
        plain = replace(
            plain, splitting=law_pivot(problem, points.full, own, factor),
            seen=law_pivot(problem, points.full, own, plain.sampled.factor * factor),
        )  # fmt: skip
    if choice.kind == "none":
        return plain
    if choice.kind == "node":
        return replace(plain, estimator=_on_nodes(problem, scenario, rule, choice.address, points, target))
    sample = points.full
    without = {**sample.draws, choice.address: np.asarray(1.0)}
    pivot = law_pivot(problem, sample, choice.address, plain.sampled.factor * target.at(without))
    return replace(plain, estimator=Estimator(rule, sample, plain.sampled, pivot, points.noise))


def draws_along(problem: Problem, sample: Sample, address: str) -> Draws:
    """The sample's draws with one input at the NODES of its score, given the others, on one more leading axis."""
    law = next(one.law for one in problem.inputs if one.address == address)
    assert not isinstance(law, Ensemble)
    location, width = conditional_score(problem, sample, address)
    nodes = NODES.reshape((-1,) + (1,) * (len(sample.groups) + 2))
    scores = width * nodes if location is None else location + width * nodes
    return {**sample.draws, address: law.from_score(scores)}


def node_axis(sample: Sample) -> int:
    """The axis of the nodes, counted from the end."""
    return -3 - len(sample.groups)


def _on_nodes(
    problem: Problem, scenario: ScenarioProblem, rule: Rule, address: str, points: Points, target: Expression
) -> Estimator:
    draws = draws_along(problem, points.thin, address)
    real = realise(scenario, draws)
    pivot = NodePivot(real.factor * target.at(draws), node_axis(points.thin))
    return Estimator(rule, points.thin, real, pivot, points.thin_noise, extra=1)


class Along:
    """A scenario along the nodes of any input, on one thin sample; realised once for each input."""

    def __init__(self, problem: Problem, scenario: ScenarioProblem, sample: Sample) -> None:
        self.sample = sample
        self._problem, self._scenario = problem, scenario
        self._known: dict[str, Realisation] = {}

    def up_to(
        self,
        address: str,
        values: Callable[[Realisation], Array],
        allowed: Callable[[Realisation], Array] | None = None,
    ) -> Callable[[Array], Array]:
        """The distribution function of a quantity that cannot be negative, per replicate, one input integrated.

        allowed: positive where the quantity is finite.
        """
        if address not in self._known:
            self._known[address] = realise(self._scenario, draws_along(self._problem, self.sample, address))
        axes = 3 + len(self.sample.groups)

        def full(made: Array) -> Array:
            return made.reshape((1,) * (axes - made.ndim) + made.shape)

        real = self._known[address]
        margin = None if allowed is None else full(allowed(real))
        found = NodeValues(full(values(real)), node_axis(self.sample), margin)
        return lambda value: self.sample.average(found.up_to(np.asarray(value).reshape((-1,) + (1,) * axes)))
