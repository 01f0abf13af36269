"""What is settled before anything is drawn, and the samples on which scenarios are answered."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass

import numpy as np

from pvfeas.conditional import NoPivot
from pvfeas.decision import Rule, limit_rule_for, rule_for
from pvfeas.errors import UsageError
from pvfeas.integration import (
    Along,
    Choice,
    Points,
    Scene,
    Steps,
    choose,
    drawn_scene,
    integrated_scene,
    noise_scores,
    own_input,
)
from pvfeas.laws import Array
from pvfeas.monte_carlo import Trials, digits_of, most_batches, trials
from pvfeas.nominal import nominal_draws
from pvfeas.options import Options
from pvfeas.points import Sample, draw
from pvfeas.problem import Expression, Problem, ScenarioProblem
from pvfeas.realisation import Realisation
from pvfeas.required import required_wall_time
from pvfeas.summaries import flattened

FIRST, SMALL = 8, 5  # exponents of two: points per replicate to begin with, and for first guesses
THINNER = 2  # along nodes the points are fewer by this exponent


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
        self.problem, self.scenario = problem, scenario
        self.rule: Rule = rule_for(problem.goal, sign)
        self.limit_rule: Rule = limit_rule_for(problem.goal, sign)
        self.target = target_of(problem, scenario)
        self.steps = Steps(problem, scenario)
        self.choice: Choice = choose(problem, scenario, self.target, self.steps)
        self.own = own_input(problem, scenario, self.steps)
        self.nominal = drawn_scene(scenario, self.rule, Sample(nominal, {}, (), (), (1, 1)), self.target)

    @property
    def budget(self) -> float:
        """Wall time of the budget, s."""
        return self.problem.goal.within[-1]

    def widest(self, values: Callable[[Realisation], Array]) -> str:
        """The input that matters most for a quantity of a realisation; empty where none can be integrated."""
        if self.steps.real is None:
            return ""
        with np.errstate(divide="ignore"):
            return self.steps.largest(self.steps.shares(np.log(values(self.steps.real))))

    def drawn(self, sample: Sample) -> Scene:
        """The scenario on a sample, nothing integrated."""
        return drawn_scene(self.scenario, self.rule, sample, self.target)


def target_of(problem: Problem, scenario: ScenarioProblem) -> Expression:
    """What the goal compares with sigma before dilution: the splitting, or the limit asked for."""
    if problem.goal.kind == "exclude" and problem.goal.limit is not None:
        return Expression(float(problem.goal.limit))
    return scenario.splitting


@dataclass(frozen=True)
class Sampling:
    """The samples of one round. thin and small are None where nothing is integrated exactly."""

    problem: Problem
    seed: int
    full: Sample
    thin: Sample | None = None
    small: Sample | None = None

    @property
    def points(self) -> int:
        """Points of the whole sample, per stratum."""
        return self.full.shape[0] * self.full.shape[1]

    def case(self, plan: Plan) -> Case:
        """A scenario on these samples."""
        if self.thin is None or self.small is None:
            return Case(plan, plan.drawn(self.full), plan.drawn(self.full), None)
        points = Points(self.full, self._noise(plan, self.full), self.thin, self._noise(plan, self.thin))
        scenario = plan.scenario
        full = integrated_scene(self.problem, scenario, plan.rule, plan.choice, points, plan.target, plan.own)
        return Case(plan, full, plan.drawn(self.small), Along(self.problem, scenario, self.thin))

    def _noise(self, plan: Plan, sample: Sample) -> Array:
        exponent = int(sample.shape[1]).bit_length() - 1
        return noise_scores(self.problem, plan.scenario.name, self.seed, exponent)


@dataclass(frozen=True)
class Case:
    """A scenario on the full sample and on a small one (for first guesses); along: along the nodes of inputs."""

    plan: Plan
    full: Scene
    small: Scene
    along: Along | None

    @property
    def problem(self) -> Problem:
        """The study."""
        return self.plan.problem

    @property
    def rule(self) -> Rule:
        """The rule of the goal."""
        return self.plan.rule

    @property
    def nominal(self) -> Scene:
        """The scenario with every input at its median."""
        return self.plan.nominal

    @property
    def budget(self) -> float:
        """Wall time of the budget, s."""
        return self.plan.budget

    @property
    def integrates(self) -> bool:
        """Whether an input is integrated exactly."""
        return not isinstance(self.full.estimator.pivot, NoPivot)


def adaptive(problem: Problem, planned: Sequence[Plan], options: Options) -> tuple[Sampling, bool]:
    """As many batches as JCGM 101:2008, 7.9 asks for, and whether they were enough.

    The model is ln(required time) of every scenario; draws that never reach the goal are not counted.
    Nothing is integrated exactly.
    """
    digits, seen = digits_of(options.tolerance), [Trials() for _ in planned]
    enough = False
    for number in range(most_batches(options)):
        batch = trials(problem, options.seed, [number])
        for one, values in zip(planned, seen, strict=True):
            scene = one.drawn(batch)
            values.add(np.log(flattened(batch, required_wall_time(scene.sampled, one.rule, scene.signal_drawn))[0]))
        enough = number > 0 and all(values.settled(digits) for values in seen)
        if enough:
            break
    return Sampling(problem, options.seed, trials(problem, options.seed, range(number + 1))), enough


def samplings(problem: Problem, options: Options, planned: Sequence[Plan]) -> Iterator[Sampling]:
    """Ever larger samples of the study; one where the Monte-Carlo method is asked for."""
    if options.method == "monte-carlo":
        yield adaptive(problem, planned, options)[0]
        return
    exponent = FIRST
    while True:
        full = draw(problem.inputs, problem.correlations, options.seed, exponent)
        yield Sampling(problem, options.seed, full, full.thinned(THINNER), full.thinned(exponent - SMALL))
        exponent += 1
        if 2**exponent > options.maximum_points:
            return
