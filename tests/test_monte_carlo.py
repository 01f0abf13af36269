"""The adaptive Monte-Carlo method: its stopping rule, and its agreement with the lattice."""

from __future__ import annotations

import numpy as np
import pytest
from workload_w import STUDY

from pvfeas.compiler import problem_of
from pvfeas.linear import numerical_tolerance
from pvfeas.monte_carlo import BATCH, Trials, trials
from pvfeas.options import Options
from pvfeas.questions.assess import assess
from pvfeas.questions.planning import Plan, adaptive
from pvfeas.studyfile import load_study

PROBLEM = problem_of(load_study(STUDY))


def test_batches_do_not_depend_on_how_many_there_are() -> None:
    two, three = trials(PROBLEM, 1, range(2)), trials(PROBLEM, 1, range(3))
    for address, values in two.draws.items():
        assert np.array_equal(
            np.broadcast_to(values, (2, BATCH)), np.broadcast_to(three.draws[address], (3, BATCH))[:2]
        )


def test_stops_as_the_clause_says() -> None:
    """The rule written out once more on normal values: h grows until 2 s <= delta for all four."""
    random, seen, kept = np.random.default_rng(3), Trials(), []
    for h in range(1, 200):
        values = random.normal(5.0, 0.7, BATCH)
        seen.add(values)
        kept.append(values)
        four = np.array([[v.mean(), v.std(ddof=1), *np.quantile(v, [0.025, 0.975])] for v in kept])
        delta = numerical_tolerance(float(np.std(np.concatenate(kept), ddof=1)), 2)
        expected = h > 1 and bool(np.all(2.0 * four.std(axis=0, ddof=1) / np.sqrt(h) <= delta))
        assert seen.settled(2) == expected
        if expected:
            break
    assert 2 < h < 199  # u = 0.70, delta = 0.005: neither at once nor never


def test_running_spread_is_that_of_all_values() -> None:
    random, seen = np.random.default_rng(4), Trials()
    batches = [random.lognormal(3.0, 1.0, 500) for _ in range(7)]
    for one in batches:
        seen.add(one)
    everything = np.concatenate(batches)
    assert seen.mean == pytest.approx(everything.mean(), rel=1e-12)  # rounding of sums
    assert np.sqrt(seen.squares / (seen.count - 1)) == pytest.approx(everything.std(ddof=1), rel=1e-12)


def test_nothing_to_wait_for() -> None:
    never, same = Trials(), Trials()
    for _ in range(2):
        never.add(np.full(BATCH, np.inf))
        same.add(np.full(BATCH, 2.0))
    assert never.settled(2)
    assert same.settled(2)


def test_more_digits_need_more_trials() -> None:
    plan = [Plan(PROBLEM, PROBLEM.scenarios[0])]
    few, enough = adaptive(PROBLEM, plan, Options(method="monte-carlo"))
    many, also = adaptive(PROBLEM, plan, Options(method="monte-carlo", tolerance=0.1, maximum_points=2**17))
    assert enough
    assert also
    assert few.points < many.points


def test_agrees_with_the_lattice() -> None:
    """Within the half-widths of both (95 % each; the seed is fixed)."""
    lattice = assess(PROBLEM, Options(tolerance=0.3)).scenarios[0]
    plain = assess(PROBLEM, Options(method="monte-carlo", tolerance=0.1, maximum_points=2**17)).scenarios[0]
    for name in ("q05", "q16", "q50", "q84", "q95"):
        one, other = getattr(lattice.required_time, name), getattr(plain.required_time, name)
        errors = lattice.required_time.error[name], plain.required_time.error[name]
        assert None not in errors
        assert abs(one - other) < sum(error for error in errors if error is not None)
    assert abs(lattice.chance.value - plain.chance.value) < lattice.chance.error + plain.chance.error
