"""Required time draw by draw: where the needed signal falls to the signal there is."""

from __future__ import annotations

import numpy as np

from pvfeas.conditional import excess
from pvfeas.decision import Rule, needed_signal
from pvfeas.laws import Array
from pvfeas.quantiles import HIGHEST, LOWEST
from pvfeas.realisation import Realisation
from pvfeas.roots import falling_root


def raw_needed(real: Realisation, rule: Rule, wall: Array) -> Array:
    """The smallest signal that meets the goal by wall time, whether the time is usable yet or not."""
    sigma = np.sqrt(real.averaging.best_variance(wall))
    return needed_signal(rule, sigma, sigma, real.relative_variance(wall))


def needed_at(real: Realisation, rule: Rule, wall: Array) -> Array:
    """The smallest signal that meets the goal by wall time, infinite where the time is not usable yet."""
    return np.asarray(np.where(real.averaging.usable(wall), raw_needed(real, rule, wall), np.inf))


def counted(rule: Rule, signal: Array) -> Array:
    """The part of a signed signal that counts: its size, or its size in the predicted direction."""
    return np.abs(signal) if not rule.one_signed else np.asarray(rule.predicted_sign * signal)


def required_wall_time(real: Realisation, rule: Rule, signal: Array) -> Array:
    """Smallest wall time in s at which each signed signal meets the goal; infinite where none does.

    The needed signal never grows with time; where it equals the signal is found in ln t.
    """
    size = counted(rule, signal)
    last = np.minimum(real.averaging.last, np.exp(HIGHEST))
    first = np.maximum(real.averaging.first, np.exp(LOWEST))
    shape = np.broadcast_shapes(size.shape, np.shape(last), np.shape(first), np.shape(real.averaging.statistical))
    low, high = np.broadcast_to(np.log(first), shape), np.broadcast_to(np.log(last), shape)

    def lacking(log_time: Array) -> Array:
        return excess(needed_at(real, rule, np.clip(np.exp(log_time), first, last)), size)

    reachable, at_once = lacking(high) <= 0.0, lacking(low) <= 0.0
    low = np.where(reachable & ~at_once, low, high)  # nothing to look for elsewhere
    found = np.where(at_once, first, np.clip(np.exp(falling_root(lacking, low, high)), first, last))
    return np.asarray(np.where(reachable & (first <= last), found, np.inf))
