"""The linear law of propagation of uncertainty on ln t (JCGM 100:2008), and whether it is adequate."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from scipy import special

from pvfeas.laws import Law, Lognormal, LogUniform
from pvfeas.nominal import stepped_draws
from pvfeas.problem import Correlation, Ensemble, Input

STEP = 1e-3  # of a score, for central differences
GRID = np.linspace(-8.0, 8.0, 4001)


def numerical_tolerance(uncertainty: float, digits: int = 1) -> float:
    """delta = 10^l/2 for u = c × 10^l with c a whole number of `digits` digits (JCGM 101:2008, 7.9.2).

    uncertainty: standard uncertainty, any unit. Returns the same unit.
    """
    if uncertainty <= 0.0 or not np.isfinite(uncertainty):
        return 0.0
    exponent = int(np.floor(np.log10(uncertainty))) - digits + 1
    if round(uncertainty / 10.0**exponent) >= 10**digits:
        exponent += 1
    return float(0.5 * 10.0**exponent)


def uncertainty_in_scores(law: Law) -> float:
    """Standard uncertainty over the slope dx/dz at the median; of ln x for laws of a factor.

    1 for normal and lognormal laws; sqrt(2 pi/12) = 0.7236 for uniform ones.
    """
    if isinstance(law, Lognormal):
        return 1.0
    weights = np.exp(-0.5 * GRID**2)
    weights = weights / weights.sum()
    values, ends = law.from_score(GRID), law.from_score(np.array([-STEP, STEP]))
    if isinstance(law, LogUniform):
        values, ends = np.log(values), np.log(ends)
    spread = np.sqrt((weights * (values - (weights * values).sum()) ** 2).sum())
    slope = (ends[1] - ends[0]) / (2.0 * STEP)
    return float(spread / slope) if slope > 0 else 0.0


def combine(contributions: Sequence[float], names: Sequence[str], correlations: Sequence[Correlation]) -> float:
    """u = sqrt(sum c_i u_i c_j u_j r_ij) (JCGM 100:2008, eq. 16), by the uncertainties library.

    contributions: c_i u_i of each named input.
    """
    from uncertainties import correlated_values_norm

    matrix = np.eye(len(names))
    place = {name: i for i, name in enumerate(names)}
    for one in correlations:
        i, j = place[one.between[0]], place[one.between[1]]
        matrix[i, j] = matrix[j, i] = one.rho
    if not names:
        return 0.0
    variables = correlated_values_norm([(0.0, 1.0)] * len(names), matrix)
    total = sum(c * v for c, v in zip(contributions, variables, strict=True))
    return float(total.std_dev)


def contributions(inputs: Sequence[Input], log_times: np.ndarray, moved: Sequence[str]) -> list[float]:
    """c_i u_i of ln t for each moved input, from ln t at steps of minus and plus STEP (shape 2 × inputs)."""
    laws = {one.address: one.law for one in inputs}
    slopes = (log_times[1::2] - log_times[::2]) / (2.0 * STEP)
    factors = []
    for address in moved:
        law = laws[address]
        factors.append(1.0 if isinstance(law, Ensemble) else uncertainty_in_scores(law))
    return [float(slope * factor) for slope, factor in zip(slopes, factors, strict=True)]


def adequate(log_time: float, u_ln: float, q05: float | None, q95: float | None) -> bool | None:
    """JCGM 101:2008 clause 8 on the 90 % interval of ln t with two significant digits.

    Adequate where both ends of ln t ± 1.645 u lie within the numerical tolerance of ln q05 and ln q95.
    """
    if q05 is None or q95 is None or q05 <= 0.0:
        return False
    if u_ln == 0.0:
        return bool(abs(log_time - np.log(q05)) < 1e-6 and abs(log_time - np.log(q95)) < 1e-6)
    expanded, delta = float(special.ndtri(0.95)) * u_ln, numerical_tolerance(u_ln, digits=2)
    low, high = abs(log_time - expanded - np.log(q05)), abs(log_time + expanded - np.log(q95))
    return bool(low <= delta and high <= delta)


__all__ = ["STEP", "adequate", "combine", "contributions", "numerical_tolerance", "stepped_draws"]
