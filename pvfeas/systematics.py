"""Named uncertainties that stand in the final budget: their size, how they average, what not knowing them costs."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy import special

from pvfeas.laws import Array
from pvfeas.tables import Schedule, Systematic

DAY, WEEK = 86400.0, 604800.0


@dataclass(frozen=True)
class Reset:
    """What resets per wall time: rate in 1/s, so that n = max(1, rate × wall)."""

    rate: Array


def resets_per_second(systematic: Systematic, schedule: Schedule) -> Array:
    """Resets per second of wall time.

    1/every; × days_per_week/7 where every is below a week, × hours_per_day/24 too where it is below
    a day: nothing is reset while nobody works.
    """
    every = np.asarray(systematic.every)
    weekly = np.where(every < WEEK, schedule.days_per_week / 7.0, 1.0)
    daily = np.where(every < DAY, schedule.hours_per_day / 24.0, 1.0)
    return np.asarray(weekly * daily / every)


def size_in_hertz(systematic: Systematic, width: Array | None, frequency: Array | None) -> Array:
    """Standard uncertainty of the splitting seen in Hz; sqrt 2 more where it belongs to one enantiomer.

    width (interrogation width, Hz) and frequency (Hz) turn fractions into Hz; a size on the
    scale stays a fraction of the splitting.
    """
    size = np.asarray(systematic.size)
    if systematic.on == "width":
        size = size * _needed(width, "interrogation width")
    if systematic.on == "frequency":
        size = size * _needed(frequency, "frequency")
    return size * np.sqrt(2.0) if systematic.of == "one enantiomer" else size


def _needed(value: Array | None, what: str) -> Array:
    if value is None:
        raise ValueError(f"a systematic on the {what} needs one")
    return np.asarray(value)


def averaged(systematic: Systematic, size: Array, wall: Array, live: Array, schedule: Schedule) -> Array:
    """Standard uncertainty left after wall time (s) and live time (s).

    never: u; per reset: u/sqrt(n), n = max(1, resets so far); as 1/t: u sqrt(after/live);
    grows: u sqrt(live/after).
    """
    if systematic.averages == "per reset":
        return np.asarray(size / np.sqrt(np.maximum(1.0, wall * resets_per_second(systematic, schedule))))
    if systematic.averages == "as 1/t":
        with np.errstate(divide="ignore"):
            return np.asarray(size * np.sqrt(systematic.after / live))
    if systematic.averages == "grows":
        return np.asarray(size * np.sqrt(live / systematic.after))
    return size


def dof_from_spread(relative_spread: Array | float) -> Array:
    """Degrees of freedom (1/2)(du/u)^-2 of an uncertainty known to du/u (JCGM 100:2008, G.4.2, eq. G.3)."""
    with np.errstate(divide="ignore"):
        return np.asarray(0.5 / np.square(relative_spread))


def welch_satterthwaite(variances: list[Array], freedoms: list[Array]) -> Array:
    """Effective degrees of freedom (sum v)^2 / sum(v^2/nu) (JCGM 100:2008, eq. G.2b); infinite without doubt.

    variances: parts of sigma^2, any unit; freedoms: their degrees of freedom, infinity allowed.
    """
    total = sum(variances, np.zeros(()))
    spent = sum((v**2 / nu for v, nu in zip(variances, freedoms, strict=True)), np.zeros(()))
    with np.errstate(divide="ignore", invalid="ignore"):
        return np.asarray(np.where(spent > 0, total**2 / spent, np.inf))


def surviving_significance(significance: Array, freedom: Array) -> Array:
    """Significance left when sigma itself is known with few degrees of freedom.

    The tail probability of Student's t with `freedom` degrees at s/sigma, turned back into
    normal sigma. 5 sigma keeps 3.28 with 8 degrees and 2.43 with 3.04.
    """
    k, nu = np.asarray(significance, dtype=float), np.asarray(freedom, dtype=float)
    finite = np.where(np.isfinite(nu), nu, 1e300)
    tail = 0.5 * special.betainc(np.minimum(finite, 1e12) / 2.0, 0.5, finite / (finite + k**2))
    with np.errstate(divide="ignore"):
        log_tail = np.where(tail > 1e-280, np.log(np.maximum(tail, 1e-300)), _log_student_tail(k, finite))
    survived = _sigma_of_log_tail(log_tail)
    return np.asarray(np.where(nu > 1e8, k, np.minimum(survived, k)))


def _log_student_tail(k: Array, nu: Array) -> Array:
    """ln P(T > k) far out: density × k/nu-type asymptote, (1 + k^2/nu)^(-nu/2) / (nu B(nu/2, 1/2) …)."""
    x = nu / (nu + k**2)
    with np.errstate(divide="ignore"):
        front = 0.5 * nu * np.log(x) - special.betaln(nu / 2.0, 0.5) - np.log(nu)
    return np.asarray(front + np.log1p(nu * x / (2.0 * (nu + 2.0))))


def _sigma_of_log_tail(log_tail: Array) -> Array:
    """k with ln Phi(-k) = log_tail, by Newton on ln Phi."""
    k = np.sqrt(np.maximum(-2.0 * log_tail, 0.0))
    for _ in range(30):
        log_density = -0.5 * k**2 - 0.5 * np.log(2.0 * np.pi)
        here = special.log_ndtr(-k)
        k = k + (here - log_tail) * np.exp(here - log_density)
    return np.asarray(k)
