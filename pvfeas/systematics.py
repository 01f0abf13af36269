"""Named uncertainties that stand in the final budget: their size, how they average, what not knowing them costs."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from scipy import special

from pvfeas.laws import Array
from pvfeas.tables import Schedule, Systematic
from pvfeas.thresholds import sigma_of_log_tail

DAY, WEEK = 86400.0, 604800.0
NEAR = 3.0  # sigma up to which a tail probability is taken from the incomplete beta function
MOST_FREEDOM = 1e15  # degrees of freedom; more cannot be told from infinity


def resets_per_second(systematic: Systematic, schedule: Schedule) -> Array:
    """Resets per second of wall time.

    1/every; × days_per_week/7 where every is below a week, × hours_per_day/24 too where it is below
    a day: nothing is reset while nobody works.
    """
    every = given(systematic.every, f"systematics.{systematic.name} needs every")
    weekly = np.where(every < WEEK, schedule.days_per_week / 7.0, 1.0)
    daily = np.where(every < DAY, schedule.hours_per_day / 24.0, 1.0)
    return np.asarray(weekly * daily / every)


def size_in_hertz(systematic: Systematic, width: Array | None, frequency: Array | None) -> Array:
    """Standard uncertainty of the splitting seen in Hz; sqrt 2 more where it belongs to one enantiomer.

    width (interrogation width, Hz) and frequency (Hz) turn fractions into Hz; a size on the
    scale stays a fraction of the splitting, one on the signal is in the signal's unit, Hz for every
    linear technique. Raises ValueError where the width or the frequency is missing.
    """
    size = np.asarray(systematic.size)
    if systematic.on == "width":
        size = size * given(width, "a systematic on the width needs an interrogation width")
    if systematic.on == "frequency":
        size = size * given(frequency, "a systematic on the frequency needs a frequency")
    return size * np.sqrt(2.0) if systematic.of == "one enantiomer" else size


def given(value: Array | None, message: str) -> Array:
    """The value as an array. Raises ValueError with the message where it is None."""
    if value is None:
        raise ValueError(message)
    return np.asarray(value)


def after_of(systematic: Systematic) -> Array:
    """Live time in s at which the size holds. Raises ValueError where it is not given."""
    return given(systematic.after, f"systematics.{systematic.name} needs after")


def averaged(systematic: Systematic, size: Array, wall: Array, live: Array, schedule: Schedule) -> Array:
    """Standard uncertainty left after wall time (s) and live time (s).

    never: u; per reset: u/sqrt(n), n = max(1, resets so far); as 1/t: u sqrt(after/live);
    grows: u sqrt(live/after).
    """
    if systematic.averages == "per reset":
        return np.asarray(size / np.sqrt(np.maximum(1.0, wall * resets_per_second(systematic, schedule))))
    if systematic.averages in ("as 1/t", "grows"):
        with np.errstate(divide="ignore", invalid="ignore"):
            ratio = after_of(systematic) / live
            ratio = ratio if systematic.averages == "as 1/t" else 1.0 / ratio
            return np.asarray(np.where(size > 0, size * np.sqrt(ratio), 0.0))
    return size


def dof_from_spread(relative_spread: Array | float) -> Array:
    """Degrees of freedom (1/2)(du/u)^-2 of an uncertainty known to du/u (JCGM 100:2008, G.4.2, eq. G.3)."""
    with np.errstate(divide="ignore"):
        return np.asarray(0.5 / np.square(relative_spread))


def welch_satterthwaite(variances: Sequence[Array], freedoms: Sequence[Array]) -> Array:
    """Effective degrees of freedom (sum v)^2 / sum(v^2/nu) (JCGM 100:2008, eq. G.2b); infinite without doubt.

    variances: independent parts of sigma^2, any unit; freedoms: their degrees of freedom, infinity allowed.
    """
    total = sum(variances, np.zeros(()))
    spent = sum((v**2 / nu for v, nu in zip(variances, freedoms, strict=True)), np.zeros(()))
    with np.errstate(divide="ignore", invalid="ignore"):
        return np.asarray(np.where(spent > 0, total**2 / spent, np.inf))


def group_freedom(sizes: Sequence[Array], freedoms: Sequence[Array]) -> Array:
    """Degrees of freedom of uncertainties that add linearly: (sum u)^2 / sum(u^2/nu).

    Derived from JCGM 100:2008, eq. G.3: each size is known to u/sqrt(2 nu), independently.
    """
    return welch_satterthwaite(sizes, freedoms)


def surviving_significance(significance: Array, freedom: Array) -> Array:
    """Significance left when sigma itself is known with few degrees of freedom.

    The tail probability of Student's t with `freedom` degrees at s/sigma, turned back into
    normal sigma (JCGM 100:2008, G.3). 5 sigma keeps 3.28 with 8 degrees and 2.43 with 3.04.
    """
    k = np.asarray(significance, dtype=float)
    nu = np.minimum(np.asarray(freedom, dtype=float), MOST_FREEDOM)
    size = np.abs(k)
    survived = np.sign(k) * np.minimum(sigma_of_log_tail(log_student_tail(size, nu)), size)
    return np.asarray(np.where(np.isinf(k), k, survived))


def log_student_tail(k: Array, nu: Array) -> Array:
    """ln P(T > k) of Student's t with nu degrees of freedom, k >= 0, however far out.

    Below 3 the incomplete beta function; above, f(k) (nu + k^2)/nu ∫ e^-y dy / sqrt(k^2 + nu (1 - e^(-2 y/nu))) over
    y > 0, f the density (derived: y = (nu/2) ln((nu + t^2)/(nu + k^2))), by Gauss–Laguerre quadrature.
    """
    k, nu = np.broadcast_arrays(np.asarray(k, dtype=float), np.asarray(nu, dtype=float))
    square = np.minimum(k, NEAR) ** 2
    near = np.log(0.5 * special.betaincc(0.5, nu / 2.0, square / (nu + square)))
    far = np.clip(k, NEAR, 1e100)
    y, weights = (part.reshape((-1,) + (1,) * k.ndim) for part in np.polynomial.laguerre.laggauss(48))
    integral = (weights / np.sqrt(far**2 - nu * np.expm1(-2.0 * y / nu))).sum(axis=0)
    log_density = -0.5 * np.log(nu) - special.betaln(nu / 2.0, 0.5) - 0.5 * (nu + 1.0) * np.log1p(far**2 / nu)
    return np.asarray(np.where(k > NEAR, log_density + np.log1p(far**2 / nu) + np.log(integral), near))
