"""Roots of many functions at once."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from pvfeas.laws import Array

MOST = 80  # steps; bisection alone would need 62 to get from 220 to 5e-17


def falling_root(function: Callable[[Array], Array], low: Array, high: Array, accuracy: float = 1e-13) -> Array:
    """Where each function, positive at low and not positive at high, changes its sign.

    Bracketing with inverse quadratic interpolation where that is safe, else bisection (Chandrupatla 1997,
    Adv. Eng. Software 28, 145; from memory). low, high: arrays of one shape, any unit; accuracy is
    relative to 1 + |x|. Where the signs at the ends are equal, the result is some number between them.
    """
    a, b = np.array(high, dtype=float), np.array(low, dtype=float)
    at_a, at_b = function(a), function(b)
    c, at_c = a.copy(), at_a.copy()
    share = np.full(a.shape, 0.5)
    for _ in range(MOST):
        x = a + share * (b - a)
        at_x = function(x)
        same = (at_x > 0) == (at_a > 0)
        c, at_c = np.where(same, a, b), np.where(same, at_a, at_b)
        b, at_b = np.where(same, b, a), np.where(same, at_b, at_a)
        a, at_a = x, at_x
        width = np.abs(b - a)
        if np.all((width <= accuracy * (1.0 + np.abs(a))) | (at_a == 0)):
            break
        share = _share(a, at_a, b, at_b, c, at_c, accuracy)
    return np.asarray(a)


def _share(a: Array, at_a: Array, b: Array, at_b: Array, c: Array, at_c: Array, accuracy: float) -> Array:
    """Where to look next, as a share of the way from a to b."""
    with np.errstate(divide="ignore", invalid="ignore"):
        xi, phi = (a - b) / (c - b), (at_a - at_b) / (at_c - at_b)
        safe = (phi**2 < xi) & ((1.0 - phi) ** 2 < 1.0 - xi)
        inner = at_a / (at_b - at_a) * at_c / (at_b - at_c)
        outer = (c - a) / (b - a) * at_a / (at_c - at_a) * at_b / (at_c - at_b)
        share = np.where(safe, inner + outer, 0.5)
        least = np.minimum(0.5, 0.5 * accuracy * (1.0 + np.abs(a)) / np.abs(b - a))
    share = np.where(np.isfinite(share), share, 0.5)
    return np.asarray(np.clip(share, least, 1.0 - least))
