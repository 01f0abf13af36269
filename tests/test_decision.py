"""What a goal asks: needed signal, outcomes that meet it, chance, contract."""

from __future__ import annotations

import json
from collections.abc import Sequence
from itertools import product
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from scipy import special

from pvfeas import limits
from pvfeas.decision import (
    Interval,
    Rule,
    chance,
    contract,
    limit_rule_for,
    needed_signal,
    outcome_limit,
    rule_for,
    signal_intervals,
)
from pvfeas.laws import Array
from pvfeas.tables import Goal
from pvfeas.thresholds import constant_boundary, effective_threshold

CHECKS = {
    check["id"]: check
    for check in json.loads((Path(__file__).parent / "data" / "checks.json").read_text(encoding="utf-8"))
}
CONSTRUCTIONS = tuple(limits.CONSTRUCTIONS)
ZERO = np.asarray(0.0)


def number(value: float) -> Array:
    return np.asarray(float(value))


def rule(kind: str, sign: float = 1.0, **more: Any) -> Rule:
    given: dict[str, Any] = {"kind": kind, "power": 0.9, "within": (86400.0,)}
    if kind in ("detect", "sign"):
        given["significance"] = 3.0
    if kind == "measure":
        given["relative_uncertainty"] = 0.2
    return rule_for(Goal(**(given | more)), sign)


def inside(intervals: Sequence[Interval], signal: Array) -> Array:
    return np.any([(low < signal) & (signal < high) for low, high in intervals], axis=0)


@pytest.mark.parametrize("name", ["det.power.k1.96", "det.power.k3"])
def test_needed_signal_and_the_time_it_costs(name: str) -> None:
    check = CHECKS[name]
    needed, times = check["expected"]
    for power, expected, factor in zip(check["inputs"]["power"], needed, times, strict=True):
        for kind in ("detect", "sign"):
            one = rule(kind, significance=check["inputs"]["k"], power=power)
            found = needed_signal(one, number(1), number(1), ZERO)
            assert found == pytest.approx(expected, rel=check["tolerance"]["rel"])
            assert (found / check["inputs"]["k"]) ** 2 == pytest.approx(factor, rel=check["tolerance"]["rel"])


@pytest.mark.parametrize(
    ("power", "factor"), [(0.5, 1), (0.8, 1.36498), (0.9, 1.57832), (0.95, 1.76616), (0.99, 2.14701)]
)
def test_five_sigma_row(power: float, factor: float) -> None:
    """Standard normal; five decimals as tabulated."""
    found = needed_signal(rule("detect", significance=5.0, power=power), number(1), number(1), ZERO)
    assert (found / 5.0) ** 2 == pytest.approx(factor, abs=5.1e-6)


def test_trapped_ions_by_hand() -> None:
    """0.0562698 Hz at 1 s, splitting 1 mHz, 3 sigma at 90 %, ee 0.9: 71658.5 s."""
    needed = needed_signal(rule("detect"), number(0.0562698), number(0.0562698), ZERO)
    assert (needed / (0.9 * 1e-3)) ** 2 == pytest.approx(71658.5, abs=0.2)  # six digits of sigma


def test_sigma_without_and_with_signal_have_their_own_places() -> None:
    found = needed_signal(rule("detect"), number(0.2), number(0.5), ZERO)
    assert found == pytest.approx(3 * 0.2 + 1.2815515655446004 * 0.5, rel=1e-14)
    low_power = rule("detect", significance=0.5, power=0.05)
    assert needed_signal(low_power, number(1), number(3), ZERO) == 0.0  # never below zero


def test_measure() -> None:
    one = rule("measure", relative_uncertainty=0.2)
    found = needed_signal(one, number(9), number(0.3), np.array([0.0, 0.12**2, 0.2**2, 0.3**2]))
    assert found == pytest.approx([1.5, 0.3 / 0.16, np.inf, np.inf], rel=1e-13)
    met = chance(one, np.array([1.49, -1.51, 1e9]), number(9), number(0.3), np.array([0.0, 0.0, 0.2**2]))
    assert met.tolist() == [0.0, 1.0, 0.0]


def test_measure_by_simulation() -> None:
    """The splitting found is outcome over purity; its relative scatter at the needed signal is the goal."""
    generator, count = np.random.default_rng(29), 400_000
    sigma, u_purity = 0.3, 0.06
    needed = float(
        needed_signal(rule("measure", relative_uncertainty=0.1), number(sigma), number(sigma), number(u_purity**2))
    )
    outcomes = needed + sigma * generator.standard_normal(count)
    found = outcomes * (1.0 + u_purity * generator.standard_normal(count))
    # the product of two small deviations adds 0.06^2 × 0.08^2 to 0.1^2: a relative 1.2e-3 of sigma
    assert np.std(found) / needed == pytest.approx(0.1, rel=1.2e-3 + 4 / np.sqrt(2 * count))


EXCLUDE = [
    ({}, 0.95, 0.9, 3.605), ({}, 0.90, 0.9, 3.290), ({}, 0.95, 0.5, 2.634), ({}, 0.90, 0.5, 2.319),
    ({"sides": 1}, 0.95, 0.9, 1.959964 + 1.281552), ({"sides": 1}, 0.90, 0.5, 1.644854),
    ({"sides": 1, "construction": "cls"}, 0.95, 0.9, 2.977),
    ({"construction": "flat-prior-abs"}, 0.95, 0.9, 1.644854 + 1.644854),
]  # fmt: skip


@pytest.mark.parametrize(("more", "confidence", "power", "expected"), EXCLUDE)
def test_exclude(more: dict[str, Any], confidence: float, power: float, expected: float) -> None:
    """Units of sigma. The flat prior at |x| = 1.645 is one-sided there: its far tail is 1e-6."""
    one = rule("exclude", confidence=confidence, power=power, **more)
    found = needed_signal(one, number(0.2), number(0.2), ZERO)
    assert found == pytest.approx(0.2 * expected, abs=0.2 * 5.1e-4)


@pytest.mark.parametrize("relative", [0.0, 0.01, 0.09, 0.2])
def test_exclude_with_an_uncertain_scale_solves_the_quadratic(relative: float) -> None:
    """Roots of (s - q)^2 = z^2 (1 + e^2 s^2) by the companion matrix: the larger one."""
    for sides, confidence, power in product((1, 2), (0.9, 0.95), (0.5, 0.9)):
        one = rule("exclude", sides=sides, confidence=confidence, power=power)
        z = float(special.ndtri((1 + confidence) / 2))
        q = float(special.ndtri(power if sides == 1 else (1 + power) / 2))
        root = max(np.roots([1 - z**2 * relative, -2 * q, q**2 - z**2]).real)
        assert needed_signal(one, number(0.7), number(0.7), number(relative)) == pytest.approx(0.7 * root, rel=1e-12)


@pytest.mark.parametrize("construction", CONSTRUCTIONS)
def test_nothing_is_excluded_on_a_scale_that_nobody_knows(construction: str) -> None:
    """z e >= 1: whatever the outcome, a splitting as large as you like would explain it."""
    one = rule("exclude", sides=1, construction=construction)
    relative = np.array([0.5**2, 0.52**2])  # z is 1.96
    needed = needed_signal(one, number(0.2), number(0.2), relative)
    assert np.isfinite(needed[0])
    assert needed[1] == np.inf
    assert chance(one, number(1e9), number(0.2), number(0.2), relative)[1] == 0.0
    low, high = signal_intervals(one, number(0.2), number(0.2), relative, number(-0.3))[0]
    assert np.isfinite(low[0])
    assert low[1] == np.inf
    assert high == np.inf


def test_bounded_limit_with_an_uncertain_scale_below_zero() -> None:
    """s/w = L(x/w) with w = sqrt(1 + e^2 s^2), L by root finding: the limit is its fixed point."""
    one = rule("exclude", sides=1)
    outcomes, relative = np.array([-4.0, -1.5, -0.3, -1e-3, 0.0, 0.8]), number(0.15)
    found = outcome_limit(one, outcomes, relative)
    wide = np.sqrt(1.0 + relative * found**2)
    assert found == pytest.approx(wide * limits.feldman_cousins_interval(outcomes / wide, 0.95)[1], abs=1e-6)
    assert np.all(np.diff(found) > 0)


def test_a_bounded_mean_with_an_uncertain_scale_is_covered() -> None:
    """Outcomes of a splitting s whose scale is off by e: s is above its limit in at most 5 % of them."""
    generator, count = np.random.default_rng(31), 200_000
    for construction, truth in product(("abs-plus-z", "feldman-cousins-bounded"), (0.5, 2.0, 5.0)):
        one = rule("exclude", sides=1, construction=construction)
        outcomes = truth * (1 + 0.3 * generator.standard_normal(count)) + generator.standard_normal(count)
        missed = np.mean(outcome_limit(one, outcomes, number(0.09)) < truth)
        assert missed <= 0.05 + 4 * np.sqrt(0.05 * 0.95 / count)


CASES: list[tuple[str, dict[str, Any]]] = [
    ("detect", {}), ("detect", {"sides": 1}), ("sign", {}), ("sign", {"significance": 0.5}),
    *(("exclude", {"sides": 2, "construction": name}) for name in limits.UNSIGNED),
    *(("exclude", {"sides": 1, "construction": name}) for name in limits.SIGNED),
]  # fmt: skip
SIGNALS = np.array([-4.1, -2.0, -0.4, 0.05, 0.9, 2.2, 3.7, 6.0])


@pytest.mark.parametrize(("kind", "more"), CASES)
@pytest.mark.parametrize("relative", [0.0, 0.04])
@pytest.mark.parametrize("sign", [1.0, -1.0])
def test_chance_is_the_share_of_noise_whose_intervals_hold_the_signal(
    kind: str, more: dict[str, Any], relative: float, sign: float
) -> None:
    """Noise scores at the centres of equal probabilities: a step lies within one of them."""
    one = rule(kind, sign, **more)
    cells = 20_001
    noise = special.ndtri((np.arange(cells) + 0.5) / cells)[:, None]
    sigma0, sigma1 = number(0.8), number(0.8 if kind != "detect" else 1.1)
    met = inside(signal_intervals(one, sigma0, sigma1, number(relative), noise), SIGNALS)
    expected = chance(one, SIGNALS, sigma0, sigma1, number(relative))
    # two ends of a step, each within a cell; interpolated limits are good to 1e-6
    assert met.mean(axis=0) == pytest.approx(expected, abs=2 / cells + 1e-5)


@pytest.mark.parametrize(("kind", "more"), CASES)
@pytest.mark.parametrize("power", [0.3, 0.5, 0.9, 0.99])
@pytest.mark.parametrize("relative", [0.0, 0.04])
def test_needed_signal_has_the_power_asked(kind: str, more: dict[str, Any], power: float, relative: float) -> None:
    one = rule(kind, **({"significance": 3.0} if kind in ("detect", "sign") else {}) | more | {"power": power})
    needed = needed_signal(one, number(0.3), number(0.3), number(relative))
    # sides = 2: the claim of the wrong sign adds Phi(-k - s/sigma), left out on purpose
    spare = special.ndtr(-3.0 - needed / 0.3) if kind == "detect" and one.sides == 2 else 0.0
    found = chance(one, needed, number(0.3), number(0.3), number(relative))
    if needed > 0:
        assert found == pytest.approx(power + spare, abs=1e-5)
    else:
        assert found >= power


@pytest.mark.parametrize("sides", [1, 2])
def test_claims_of_whole_campaigns(sides: int) -> None:
    """Outcomes drawn around the signal, claimed beyond k sigma0: the share of claims is the chance."""
    one = rule("detect", -1.0, significance=2.0, sides=sides)
    generator, count = np.random.default_rng(37), 200_000
    for signal in (0.0, -0.9, 1.4):
        outcomes = signal + 0.6 * generator.standard_normal(count)
        beyond = np.abs(outcomes) > 2 * 0.5 if sides == 2 else -outcomes > 2 * 0.5
        p = float(chance(one, number(signal), number(0.5), number(0.6), ZERO))
        assert np.mean(beyond) == pytest.approx(p, abs=4 * np.sqrt(p * (1 - p) / count))


@pytest.mark.parametrize("sides", [1, 2])
def test_false_claims_without_splitting(sides: int) -> None:
    one = rule("detect", significance=2.0, sides=sides)
    assert chance(one, ZERO, number(0.5), number(0.5), ZERO) == pytest.approx(sides * 0.022750131948179, rel=1e-12)


def test_a_sign_is_claimed_wrongly_in_one_tail_at_most() -> None:
    """Without splitting to speak of, half of all claims beyond k name the wrong sign: Phi(-k) of all outcomes."""
    one = rule("sign", significance=1.5)
    outcomes = 1e-9 + np.random.default_rng(41).standard_normal(200_000)
    p = 0.06680720126885807
    assert np.mean(outcomes < -1.5) == pytest.approx(p, abs=4 * np.sqrt(p / 200_000))
    for signal in (1e-9, -1e-9):
        assert chance(one, number(signal), number(1), number(1), ZERO) == pytest.approx(p, rel=1e-6)  # right claims
    assert contract(one, True, True).p == pytest.approx(p, rel=1e-12)


@pytest.mark.parametrize("kind", ["detect", "sign", "exclude"])
def test_no_noise_at_all_is_a_step(kind: str) -> None:
    one = rule(kind)
    assert chance(one, np.array([0.0, 1e-9, -1.0]), ZERO, ZERO, ZERO) == pytest.approx([0, 1, 1], abs=0)
    assert needed_signal(one, ZERO, ZERO, number(0.01)) == 0.0


def test_wrong_sign_never_counts_where_the_sign_is_predicted() -> None:
    up, down = rule("detect", 1.0, sides=1), rule("detect", -1.0, sides=1)
    sigma = number(0.1)
    assert chance(up, number(-5), sigma, sigma, ZERO) == 0.0
    assert chance(down, number(-5), sigma, sigma, ZERO) == 1.0
    assert not np.any(inside(signal_intervals(up, sigma, sigma, ZERO, number(0.3)), number(-5)))
    assert np.all(inside(signal_intervals(down, sigma, sigma, ZERO, number(0.3)), number(-5)))


def test_trials_and_looks_raise_the_threshold_of_the_rule() -> None:
    one = rule("detect", significance=5.0, trials=10, looks=12)
    assert one.k == effective_threshold(5.0, 2, 10, 12) > 5.4
    assert rule("sign", significance=3.0, looks=5).k == constant_boundary(3.0, 1, 5)
    assert rule("measure", looks=5, trials=3).k == 0.0


def test_everything_broadcasts() -> None:
    sigma = np.geomspace(0.1, 10, 5).reshape(5, 1, 1)
    signal, noise = np.linspace(-3, 3, 4).reshape(4, 1), np.linspace(-2, 2, 3)
    for kind, more in [*CASES, ("measure", {})]:
        one = rule(kind, **more)
        assert np.broadcast_shapes(needed_signal(one, sigma, sigma, noise**2 / 100).shape, (5, 4, 3)) == (5, 4, 3)
        assert np.broadcast_shapes(chance(one, signal, sigma, sigma, noise**2 / 100).shape, (5, 4, 3)) == (5, 4, 3)
        for low, high in signal_intervals(one, sigma, sigma, noise**2 / 100, noise):
            assert np.broadcast_shapes(low.shape, high.shape, (5, 1, 3)) == (5, 1, 3)
            assert not np.any(np.isnan(low) | np.isnan(high))


def test_default_constructions() -> None:
    assert rule("exclude").construction == "abs-plus-z"
    assert rule("exclude", sides=1).construction == "feldman-cousins-bounded"
    goal = Goal(kind="detect", significance=5.0, power=0.8, within=(1.0,), confidence=0.9)
    limit_rule = limit_rule_for(goal, 1.0)
    assert (limit_rule.kind, limit_rule.construction, limit_rule.confidence) == ("exclude", "abs-plus-z", 0.9)


def test_contract_of_a_detection() -> None:
    found = contract(rule("detect", significance=5.0, looks=12, trials=2), False, True)
    assert (found.null, found.threshold, found.sides, found.trials, found.looks) == ("no splitting", 5.0, 2, 2, 12)
    assert found.threshold_used == effective_threshold(5.0, 2, 2, 12)
    assert found.p == pytest.approx(5.733e-7, rel=1e-4)  # standard tables
    assert found.power == 0.9
    assert found.confidence is None
    assert found.construction is None
    assert not found.floor_declared
    assert found.schedule_declared
    assert "once per draw" in found.drawn
    assert "sigma" in found.unknown_after


def test_contract_of_an_exclusion_names_its_construction() -> None:
    found = contract(rule("exclude", sides=1, construction="cls", confidence=0.9), True, False)
    assert (found.construction, found.confidence, found.threshold, found.p) == ("cls", 0.9, None, None)
    assert "predicted direction" in found.null
    assert found.floor_declared


def test_contract_without_a_power() -> None:
    goal = Goal(kind="measure", relative_uncertainty=0.1, within=(1.0,))
    found = contract(rule_for(goal, 1.0), True, True)
    assert found.power is None
    assert "measured" in found.null
