"""Required time draw by draw: where the needed signal falls to the signal there is."""

from __future__ import annotations

import numpy as np

from pvfeas.decision import Rule, needed_signal
from pvfeas.laws import Array
from pvfeas.quantiles import HIGHEST, LOWEST
from pvfeas.realisation import Realisation

HALVINGS = 62  # of 220 in ln t: 5e-17


def needed_at(real: Realisation, rule: Rule, wall: Array) -> Array:
    """The smallest signal that meets the goal by wall time, infinite where the time is not usable yet."""
    sigma = np.sqrt(real.averaging.best_variance(wall))
    needed = needed_signal(rule, sigma, sigma, real.relative_variance(wall))
    return np.asarray(np.where(real.averaging.usable(wall), needed, np.inf))


def counted(rule: Rule, signal: Array) -> Array:
    """The part of a signed signal that counts: its size, or its size in the predicted direction."""
    return np.abs(signal) if not rule.one_signed else np.asarray(rule.predicted_sign * signal)


def required_wall_time(real: Realisation, rule: Rule, signal: Array) -> Array:
    """Smallest wall time in s at which each signed signal meets the goal; infinite where none does.

    Bisection in ln t, element by element; the needed signal never grows with time.
    """
    size = counted(rule, signal)

    def met(wall: Array) -> Array:
        return np.asarray(size >= needed_at(real, rule, wall))

    last = np.minimum(real.averaging.last, np.exp(HIGHEST))
    first = np.maximum(real.averaging.first, np.exp(LOWEST))
    shape = np.broadcast_shapes(size.shape, np.shape(last), np.shape(first), np.shape(real.averaging.statistical))
    low = np.broadcast_to(np.log(first), shape).copy()
    high = np.broadcast_to(np.log(last), shape).copy()
    reachable, at_once = met(np.asarray(np.exp(high))), met(np.broadcast_to(first, shape))
    for _ in range(HALVINGS):
        middle = (low + high) / 2.0
        enough = met(np.exp(middle))
        low, high = np.where(enough, low, middle), np.where(enough, middle, high)
    found = np.where(at_once, first, np.exp(high))
    return np.asarray(np.where(reachable & (first <= last), found, np.inf))
