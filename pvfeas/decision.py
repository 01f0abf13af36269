"""What a goal asks of signal and sigma: the signal needed, the outcomes that meet it, the chance.

Everything broadcasts; sigma0 and sigma1 are the standard uncertainties without and with signal
(equal for linear techniques), both with the systematics; relative_variance is that of the
splitting that remains at the end (purity, systematics on the scale).
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from scipy import special

from pvfeas.keys import keys_of
from pvfeas.laws import Array
from pvfeas.limits import chance_of_limit, limit, lowest_accepted, outcome_quantile, root_of, two_sided_z
from pvfeas.results import Contract
from pvfeas.tables import Goal
from pvfeas.thresholds import effective_threshold, p_value

Interval = tuple[Array, Array]
QUADRATIC = ("abs-plus-z", "feldman-cousins-bounded")  # limits that a relative uncertainty widens exactly


@dataclass(frozen=True)
class Rule:
    """A goal turned into numbers, for one scenario.

    k: threshold in sigma, raised for trials and looks. z_power: Phi^-1(power). predicted_sign:
    +1 or -1, that of the splitting's median.
    """

    kind: str
    k: float = 0.0
    power: float = 0.5
    sides: int = 2
    predicted_sign: float = 1.0
    confidence: float = 0.95
    construction: str = "abs-plus-z"
    relative_uncertainty: float = 1.0
    asked: float | None = None  # the threshold before trials and looks
    trials: int = 1
    looks: int = 1
    power_asked: bool = True

    @property
    def one_signed(self) -> bool:
        """Whether only a signal of the predicted sign counts."""
        return self.sides == 1 and self.kind == "detect"

    @property
    def z_power(self) -> float:
        """Phi^-1(power)."""
        return float(special.ndtri(self.power))


def default_construction(sides: int) -> str:
    """abs-plus-z where the sign is unknown, feldman-cousins-bounded where it is predicted."""
    return "abs-plus-z" if sides == 2 else "feldman-cousins-bounded"


def confidence_of(goal: Goal) -> float:
    """The goal's confidence level, its declared default where none is given."""
    return float(str(keys_of(Goal)["confidence"].default)) if goal.confidence is None else goal.confidence


def rule_for(goal: Goal, predicted_sign: float) -> Rule:
    """The rule of a goal. Power defaults to one half where the goal does not ask for one.

    A false claim of a sign is one-sided, whatever the sides of the goal.
    """
    asked, sides = goal.significance, 1 if goal.kind == "sign" else goal.sides
    k = 0.0
    if goal.kind in ("detect", "sign") and asked is not None:
        k = effective_threshold(asked, sides, goal.trials, goal.looks)
    return Rule(
        kind=goal.kind, k=k, power=0.5 if goal.power is None else goal.power, sides=sides,
        predicted_sign=predicted_sign, confidence=confidence_of(goal),
        construction=goal.construction or default_construction(goal.sides),
        relative_uncertainty=goal.relative_uncertainty or 1.0, asked=asked, trials=goal.trials, looks=goal.looks,
        power_asked=goal.power is not None,
    )  # fmt: skip


def limit_rule_for(goal: Goal, predicted_sign: float) -> Rule:
    """The rule of the limit that a campaign without splitting would state."""
    construction = goal.construction or default_construction(goal.sides)
    return Rule(
        kind="exclude", power=0.5 if goal.power is None else goal.power, sides=goal.sides,
        predicted_sign=predicted_sign, confidence=confidence_of(goal), construction=construction,
    )  # fmt: skip


def needed_signal(rule: Rule, sigma0: Array, sigma1: Array, relative_variance: Array) -> Array:
    """The smallest signal that meets the goal with the asked power; infinite where none does.

    detect: k sigma0 + z_power sigma1; sign: (k + z_power) sigma; measure r:
    sigma/sqrt(r^2 - relative_variance), no power; exclude: see needed_to_exclude.
    """
    if rule.kind == "measure":
        room = rule.relative_uncertainty**2 - relative_variance
        with np.errstate(divide="ignore", invalid="ignore"):
            return np.asarray(np.where(room > 0, sigma1 / np.sqrt(np.maximum(room, 0.0)), np.inf))
    if rule.kind == "exclude":
        return needed_to_exclude(rule, sigma0, relative_variance)
    return np.asarray(np.maximum(rule.k * sigma0 + rule.z_power * sigma1, 0.0))


def needed_to_exclude(rule: Rule, sigma: Array, relative_variance: Array) -> Array:
    """The signal that is excluded with the asked power if there is none: the limit at the outcome's power quantile.

    (z + Phi^-1((1 + power)/2)) sigma for abs-plus-z, (z + z_power) sigma for feldman-cousins-bounded;
    infinite where the relative uncertainty is too large for any limit.
    """
    size = outcome_limit(rule, np.asarray(outcome_quantile(rule.construction, rule.power)), relative_variance)
    return _times_sigma(size, sigma)


def _times_sigma(size: Array, sigma: Array) -> Array:
    with np.errstate(invalid="ignore"):
        return np.asarray(np.where(np.isinf(size), np.inf, size * sigma))


def outcome_limit(rule: Rule, outcome: Array, relative_variance: Array) -> Array:
    """The limit over sigma that an outcome over sigma gives, a relative uncertainty e of the splitting included.

    An excluded s widens its own outcome to w = sqrt(1 + e^2 s^2): the limit solves s/w = L(x/w), which for
    abs-plus-z and feldman-cousins-bounded at x >= 0 is (s - x)^2 = z^2 (1 + e^2 s^2). The other
    constructions are divided by 1 - z e, which is never too small. Infinite where z e >= 1. Derived.
    """
    z = float(two_sided_z(rule.confidence))
    relative = np.asarray(relative_variance, dtype=float)
    possible = z**2 * relative < 1.0
    spread = np.where(possible, z**2 * relative, 0.0)
    room = 1.0 - spread
    if rule.construction in QUADRATIC:
        x = np.abs(outcome) if rule.construction == "abs-plus-z" else np.maximum(outcome, 0.0)
        size = (x + np.sqrt(spread * x**2 + room * z**2)) / room
        if rule.construction == "feldman-cousins-bounded" and np.any(outcome < 0.0):
            size = np.where(outcome < 0.0, _limit_below_zero(rule, outcome, spread / z**2), size)
    else:
        size = limit(rule.construction, outcome, rule.confidence) / (1.0 - np.sqrt(spread))
    return np.asarray(np.where(possible, size, np.inf))


def _limit_below_zero(rule: Rule, outcome: Array, relative: Array) -> Array:
    """outcome_limit for feldman-cousins-bounded and outcomes below zero; relative < 1/z^2."""
    plain = limit(rule.construction, outcome, rule.confidence)
    if not np.any(relative):
        return plain
    z = two_sided_z(rule.confidence)
    below, relative = np.broadcast_arrays(np.minimum(outcome, 0.0), relative)
    highest = z / np.sqrt(1.0 - z**2 * relative)
    found = root_of(lambda s: _least_accepted(rule, s, relative) - below, np.zeros_like(below), highest)
    return np.asarray(np.where(relative > 0.0, found, plain))


def _least_accepted(rule: Rule, size: Array, relative: Array) -> Array:
    """Outcome over sigma up to which a signal over sigma is excluded: w x1(s/w), w = sqrt(1 + e^2 s^2)."""
    wide = np.sqrt(1.0 + relative * size**2)
    if rule.construction == "abs-plus-z":
        return np.asarray(size - wide * two_sided_z(rule.confidence))
    return np.asarray(wide * lowest_accepted(size / wide, rule.confidence))


def signal_intervals(
    rule: Rule, sigma0: Array, sigma1: Array, relative_variance: Array, noise: Array
) -> tuple[Interval, ...]:
    """Open intervals of the signed signal in which the goal is met, given the noise's normal score.

    The claim compares s + sigma1 noise with k sigma0. exclude: the outcome is noise alone and the
    limit must lie below |s|.
    """
    infinite = np.array(np.inf)
    if rule.kind == "measure":
        least = needed_signal(rule, sigma0, sigma1, relative_variance)
        return ((least, infinite), (-infinite, -least))
    if rule.kind == "exclude":
        least = _times_sigma(outcome_limit(rule, noise, relative_variance), sigma0)
        return ((least, infinite), (-infinite, -least))
    up, down = rule.k * sigma0 - sigma1 * noise, -rule.k * sigma0 - sigma1 * noise
    if rule.kind == "sign":  # the claimed sign must be the true one
        return ((np.maximum(up, 0.0), infinite), (-infinite, np.minimum(down, 0.0)))
    if not rule.one_signed:
        return ((up, infinite), (-infinite, down))
    return ((up, infinite),) if rule.predicted_sign > 0 else ((-infinite, down),)


def chance(rule: Rule, signal: Array, sigma0: Array, sigma1: Array, relative_variance: Array) -> Array:
    """Probability of meeting the goal given the signed signal.

    detect: Phi((s - k sigma0)/sigma1) + Phi((-s - k sigma0)/sigma1), first term only with a predicted
    sign; sign: Phi(|s|/sigma - k); measure: 0 or 1; exclude: P(limit < |s|) without splitting.
    """
    size = np.abs(signal)
    if rule.kind == "measure":
        return np.asarray(size >= needed_signal(rule, sigma0, sigma1, relative_variance), dtype=float)
    if rule.kind == "exclude":
        return _chance_to_exclude(rule, size, sigma0, relative_variance)
    if rule.kind == "sign":
        return _phi(size - rule.k * sigma0, sigma1)
    if rule.one_signed:
        return _phi(rule.predicted_sign * signal - rule.k * sigma0, sigma1)
    return _phi(size - rule.k * sigma0, sigma1) + _phi(-size - rule.k * sigma0, sigma1)


def _phi(distance: Array, sigma: Array) -> Array:
    """Phi(distance/sigma); a step where sigma is 0."""
    with np.errstate(divide="ignore", invalid="ignore"):
        ratio = distance / sigma
    step = np.where(distance > 0, np.inf, -np.inf)
    return np.asarray(special.ndtr(np.where(np.asarray(sigma) > 0, ratio, step)))


def _chance_to_exclude(rule: Rule, size: Array, sigma: Array, relative_variance: Array) -> Array:
    z = float(two_sided_z(rule.confidence))
    with np.errstate(divide="ignore", invalid="ignore", over="ignore"):
        ratio = np.where(np.asarray(sigma) > 0, size / sigma, np.where(size > 0, np.inf, 0.0))
    ratio = np.minimum(ratio, 1e100)
    relative = np.asarray(relative_variance, dtype=float)
    possible = z**2 * relative < 1.0
    relative = np.where(possible, relative, 0.0)
    if rule.construction in QUADRATIC:
        found = special.ndtr(_least_accepted(rule, ratio, relative))
        if rule.construction == "abs-plus-z":
            found = np.maximum(0.0, 2.0 * found - 1.0)
    else:
        found = chance_of_limit(rule.construction, ratio * (1.0 - z * np.sqrt(relative)), rule.confidence)
    return np.asarray(np.where(possible, found, 0.0))


DRAWN = "every uncertain input of the study, once per draw and constant in it"
UNKNOWN_AFTER = "counting noise, reference noise and the systematics, through sigma only"
NULLS: dict[str, Callable[[Rule], str]] = {
    "detect": lambda rule: "no splitting",
    "sign": lambda rule: "a splitting of the opposite sign",
    "measure": lambda rule: "none: the splitting is measured to a relative uncertainty",
    "exclude": lambda rule: (
        "no splitting; limits are stated on its size"
        if rule.sides == 2
        else "no splitting; limits are stated in the predicted direction"
    ),
}


def contract(rule: Rule, floor_declared: bool, schedule_declared: bool) -> Contract:
    """The decision contract that every result prints."""
    claims = rule.kind in ("detect", "sign")
    return Contract(
        null=NULLS[rule.kind](rule),
        threshold=rule.asked if claims else None,
        threshold_used=rule.k if claims else None,
        p=p_value(rule.asked, rule.sides) if claims and rule.asked is not None else None,
        sides=rule.sides, trials=rule.trials, looks=rule.looks,
        power=rule.power if rule.power_asked else None,
        confidence=rule.confidence if rule.kind == "exclude" else None,
        construction=rule.construction if rule.kind == "exclude" else None,
        drawn=DRAWN, unknown_after=UNKNOWN_AFTER,
        floor_declared=floor_declared, schedule_declared=schedule_declared,
    )  # fmt: skip
