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

from pvfeas.laws import Array
from pvfeas.limits import chance_of_limit, limit, outcome_quantile, planned_limit, two_sided_z
from pvfeas.results import Contract
from pvfeas.tables import Goal
from pvfeas.thresholds import effective_threshold, p_value

Interval = tuple[Array, Array]


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


def rule_for(goal: Goal, predicted_sign: float) -> Rule:
    """The rule of a goal. Power defaults to one half where the goal does not ask for one."""
    asked = goal.significance
    k = 0.0
    if goal.kind in ("detect", "sign") and asked is not None:
        k = effective_threshold(asked, goal.sides, goal.trials, goal.looks)
    return Rule(
        kind=goal.kind, k=k, power=0.5 if goal.power is None else goal.power, sides=goal.sides,
        predicted_sign=predicted_sign, confidence=goal.confidence,
        construction=goal.construction or default_construction(goal.sides),
        relative_uncertainty=goal.relative_uncertainty or 1.0, asked=asked, trials=goal.trials, looks=goal.looks,
        power_asked=goal.power is not None,
    )  # fmt: skip


def limit_rule_for(goal: Goal, predicted_sign: float) -> Rule:
    """The rule of the limit that a campaign without splitting would state."""
    construction = goal.construction or default_construction(goal.sides)
    return Rule(
        kind="exclude", power=0.5 if goal.power is None else goal.power, sides=goal.sides,
        predicted_sign=predicted_sign, confidence=goal.confidence, construction=construction,
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
    """The signal that is excluded with the asked power if there is none.

    Without relative uncertainty e: the limit at the power quantile q of the outcome, (q + z) sigma for
    abs-plus-z and feldman-cousins-bounded. With it these two solve (s - q sigma)^2 = z^2 (sigma^2 + e^2 s^2);
    the other constructions are divided by 1 - z e, which is never too small. Infinite where z e >= 1.
    Derived: the scale's uncertainty acts on the excluded signal itself.
    """
    z = float(two_sided_z(rule.confidence))
    spread = z**2 * np.asarray(relative_variance)
    possible = spread < 1.0
    room = np.where(possible, 1.0 - spread, 1.0)
    if rule.construction in ("abs-plus-z", "feldman-cousins-bounded"):
        q = outcome_quantile(rule.construction, rule.power)
        size = (q + np.sqrt(np.maximum(q**2 - room * (q**2 - z**2), 0.0))) / room
    else:
        plain = planned_limit(rule.construction, rule.confidence, rule.power)
        size = plain / (1.0 - np.sqrt(np.where(possible, spread, 0.0)))
    with np.errstate(invalid="ignore"):
        return np.asarray(np.where(possible, size * sigma, np.inf))


def outcome_limit(rule: Rule, outcome: Array, relative_variance: Array) -> Array:
    """The limit over sigma that an outcome over sigma gives, relative uncertainty included."""
    z = float(two_sided_z(rule.confidence))
    spread = z**2 * np.asarray(relative_variance)
    possible = spread < 1.0
    room = np.where(possible, 1.0 - spread, 1.0)
    if rule.construction == "abs-plus-z":
        q = np.abs(outcome)
        size = (q + np.sqrt(np.maximum(q**2 - room * (q**2 - z**2), 0.0))) / room
    else:
        size = limit(rule.construction, outcome, rule.confidence) / (1.0 - np.sqrt(np.where(possible, spread, 0.0)))
    return np.asarray(np.where(possible, size, np.inf))


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
        with np.errstate(invalid="ignore"):
            least = outcome_limit(rule, noise, relative_variance) * sigma0
        least = np.where(np.isnan(least), np.inf, least)
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
    with np.errstate(divide="ignore", invalid="ignore"):
        ratio = np.where(np.asarray(sigma) > 0, size / sigma, np.where(size > 0, np.inf, 0.0))
    spread = np.asarray(relative_variance)
    if rule.construction in ("abs-plus-z", "feldman-cousins-bounded"):
        with np.errstate(invalid="ignore", over="ignore"):
            outcome = ratio - z * np.sqrt(1.0 + np.where(spread > 0, spread * ratio**2, 0.0))
            outcome = np.where(np.isnan(outcome), np.where(z**2 * spread < 1.0, np.inf, -np.inf), outcome)
        if rule.construction == "abs-plus-z":
            return np.maximum(0.0, 2.0 * special.ndtr(outcome) - 1.0)
        if not np.any(spread):
            return chance_of_limit(rule.construction, ratio, rule.confidence)
        return np.asarray(special.ndtr(outcome))
    shrunk = ratio * np.maximum(0.0, 1.0 - z * np.sqrt(spread))
    return chance_of_limit(rule.construction, shrunk, rule.confidence)


DRAWN = "every uncertain input of the study, once per draw and constant in it"
UNKNOWN_AFTER = "counting noise, reference noise and the systematics, through sigma only"
NULLS: dict[str, Callable[[Rule], str]] = {
    "detect": lambda rule: "no splitting",
    "sign": lambda rule: "a splitting of the opposite sign",
    "measure": lambda rule: "none: the splitting is measured to a relative uncertainty",
    "exclude": lambda rule: "no splitting; limits are stated on its size"
    if rule.sides == 2
    else "no splitting; limits are stated in the predicted direction",
}


def contract(rule: Rule, floor_declared: bool, schedule_declared: bool) -> Contract:
    """The decision contract that every result prints."""
    claims = rule.kind in ("detect", "sign")
    sides = 1 if rule.kind == "sign" else rule.sides
    return Contract(
        null=NULLS[rule.kind](rule),
        threshold=rule.asked if claims else None,
        threshold_used=rule.k if claims else None,
        p=p_value(rule.asked, sides) if claims and rule.asked is not None else None,
        sides=rule.sides, trials=rule.trials, looks=rule.looks,
        power=rule.power if rule.power_asked else None,
        confidence=rule.confidence if rule.kind == "exclude" else None,
        construction=rule.construction if rule.kind == "exclude" else None,
        drawn=DRAWN, unknown_after=UNKNOWN_AFTER,
        floor_declared=floor_declared, schedule_declared=schedule_declared,
    )  # fmt: skip

