"""Cramér–Rao bound of a line centre from a scan with nuisance parameters.

sigma = kappa sqrt(FWHM × spacing)/SNR with white noise (SNR: peak over rms of one point) and
sigma = kappa sqrt(FWHM × spacing/counts) with shot noise (counts: of the line alone in one
point at its peak). kappa^2 is the centre's element of the inverse of
M_ij = integral of f_i f_j w dx over the span, x in FWHM, with f = dg/dx for the centre, g, x dg/dx, 1, x
and the Hilbert partner for amplitude, width, baseline, slope and asymmetry, and w = 1 or 1/(g + background).
Landman, Roussel-Dupré & Tanigawa 1982, Astrophys. J. 261, 732 (Gaussian 0.692, infinite span; from
memory); Lorentzian sqrt(2/pi). Shot noise: Bobroff 1986, Rev. Sci. Instrum. 57, 1152 (from memory).
"""

from __future__ import annotations

from functools import lru_cache

import numpy as np

from pvfeas.laws import Array
from pvfeas.profiles import PROFILES, Profile

FREE = ("amplitude", "width", "baseline", "slope", "asymmetry")
EVEN = ("amplitude", "width", "baseline")
MOST_SUMMED = 256  # points up to which the sum over the points itself is taken
COARSE = 0.5  # spacing in FWHM above which the sum depends on where the points happen to lie
NODES = 64
TABLE_LOW, TABLE_HIGH, TABLE_STEPS = float(np.log(0.02)), float(np.log(2e5)), 1024
LEAST_RATE = 1e-15  # of the peak counts, so that empty points do not weigh infinitely


def columns(profile: Profile, x: Array, free: tuple[str, ...]) -> list[Array]:
    """Derivatives of the signal by each free nuisance parameter and, last, by the centre."""
    slope = profile.slope(x)
    every = {
        "amplitude": lambda: profile.value(x),
        "width": lambda: x * slope,
        "baseline": lambda: np.ones_like(x),
        "slope": lambda: x,
        "asymmetry": lambda: profile.partner(x),
    }
    return [every[name]() for name in FREE if name in free] + [slope]


def centre_information(vectors: list[Array], weights: Array) -> Array:
    """Information on the last parameter when all others are free, by symmetric elimination.

    vectors: one array per parameter, points along the last axis; weights likewise. Zero where the
    points cannot tell the parameters apart.
    """
    count = len(vectors)
    matrix = [[(vectors[i] * vectors[j] * weights).sum(axis=-1) for j in range(i + 1)] for i in range(count)]
    scale = [np.sqrt(matrix[i][i]) for i in range(count)]
    with np.errstate(divide="ignore", invalid="ignore"):
        matrix = [[matrix[i][j] / (scale[i] * scale[j]) for j in range(i + 1)] for i in range(count)]
        for k in range(count - 1):
            for i in range(k + 1, count):
                factor = matrix[i][k] / matrix[k][k]
                for j in range(k + 1, i + 1):
                    matrix[i][j] = matrix[i][j] - factor * matrix[j][k]
        left = matrix[-1][-1]
        sound = np.isfinite(left) & (left > 1e-12)
        for k in range(count - 1):
            sound = sound & (matrix[k][k] > 1e-14)
    return np.asarray(np.where(sound, np.where(sound, left, 0.0) * scale[-1] ** 2, 0.0))


def _weights(profile: Profile, x: Array, background: Array | None) -> Array:
    if background is None:
        return np.ones_like(x)
    return np.asarray(1.0 / np.maximum(profile.value(x) + background, LEAST_RATE))


def _kappa_of_information(information: Array) -> Array:
    with np.errstate(divide="ignore"):
        return np.asarray(1.0 / np.sqrt(information))


def kappa_of_points(
    profile: str, free: tuple[str, ...], span: Array, offset: Array, points: int, background: Array | None
) -> Array:
    """kappa from the sum over the points themselves, which lie at the bin centres.

    span, offset: in FWHM, any shape; points: how many.
    """
    shape = PROFILES[profile]
    place = (np.arange(points) + 0.5) / points - 0.5
    x = offset[..., None] + span[..., None] * place
    behind = None if background is None else background[..., None]
    weights = _weights(shape, x, behind) * (span / points)[..., None]
    return _kappa_of_information(centre_information(columns(shape, x, free), weights))


def kappa_of_span(
    profile: str, free: tuple[str, ...], span: Array, offset: Array, background: Array | None
) -> Array:
    """kappa for points that lie densely: Gauss–Legendre in u with x = sinh(u)/2, exact to 1e-9 up to 1e5 FWHM.

    span, offset: in FWHM, any shape.
    """
    shape = PROFILES[profile]
    nodes, weights = np.polynomial.legendre.leggauss(NODES)
    low, high = np.arcsinh(2.0 * offset - span), np.arcsinh(2.0 * offset + span)
    half, middle = (high - low)[..., None] / 2.0, (high + low)[..., None] / 2.0
    u = middle + half * nodes
    x = np.sinh(u) / 2.0
    behind = None if background is None else background[..., None]
    measure = _weights(shape, x, behind) * half * weights * np.cosh(u) / 2.0
    return _kappa_of_information(centre_information(columns(shape, x, free), measure))


def kappa(
    profile: str, free: tuple[str, ...], span: Array, offset: Array, points: Array, background: Array | None = None
) -> Array:
    """kappa of a scan: the sum over the points where it is well defined, the integral over the span otherwise.

    profile: lorentzian or gaussian; free: nuisance parameters; span, offset: in FWHM; points: how
    many; background: counts per point over those of the line at its peak (shot noise), or None (white).
    All broadcast; the cost per draw does not depend on the number of points.
    """
    centred = not np.any(offset)
    if centred:
        free = tuple(name for name in free if name not in EVEN)
    small = all(np.size(one) == 1 for one in (span, offset, points)) and (background is None or np.size(background) == 1)
    if small:
        shape = np.broadcast_shapes(np.shape(span), np.shape(offset), np.shape(points))
        one = _kappa_at(profile, free, _first(span), _first(offset), _first(points), _maybe(background))
        return np.full(shape, one)
    if centred and np.size(points) == 1 and (background is None or np.size(background) == 1):
        return _interpolated(profile, free, span, _first(points), _maybe(background))
    shaped = np.broadcast_arrays(span, offset, *([] if background is None else [background]))
    return kappa_of_span(profile, free, shaped[0], shaped[1], shaped[2] if background is not None else None)


def _first(values: Array) -> float:
    return float(np.reshape(values, -1)[0])


def _maybe(values: Array | None) -> float | None:
    return None if values is None else _first(values)


def _summed(points: float) -> bool:
    return points <= MOST_SUMMED and points == int(points)


@lru_cache(maxsize=1024)
def _kappa_at(
    profile: str, free: tuple[str, ...], span: float, offset: float, points: float, background: float | None
) -> float:
    behind = None if background is None else np.array([background])
    if _summed(points) and span / points <= COARSE:
        return _first(kappa_of_points(profile, free, np.array([span]), np.array([offset]), int(points), behind))
    return _first(kappa_of_span(profile, free, np.array([span]), np.array([offset]), behind))


@lru_cache(maxsize=64)
def _kappa_table(profile: str, free: tuple[str, ...], points: float, background: float | None) -> Array:
    """ln kappa on a regular grid of ln span, centred scans."""
    span = np.exp(np.linspace(TABLE_LOW, TABLE_HIGH, TABLE_STEPS + 1))
    offset = np.zeros_like(span)
    behind = None if background is None else np.full_like(span, background)
    found = kappa_of_span(profile, free, span, offset, behind)
    if _summed(points):
        summed = kappa_of_points(profile, free, span, offset, int(points), behind)
        found = np.where(span / points <= COARSE, summed, found)
    return np.asarray(np.log(found))


def _interpolated(
    profile: str, free: tuple[str, ...], span: Array, points: float, background: float | None
) -> Array:
    """kappa by cubic interpolation (Catmull–Rom) in ln span; exact to 1e-6 away from the ends of the table."""
    table = _kappa_table(profile, free, points, background)
    step = (TABLE_HIGH - TABLE_LOW) / TABLE_STEPS
    place = np.clip((np.log(span) - TABLE_LOW) / step, 1.0, TABLE_STEPS - 2.000001)
    left = place.astype(np.int64)
    x = place - left
    before, here, there, after = table[left - 1], table[left], table[left + 1], table[left + 2]
    with np.errstate(invalid="ignore"):
        value = here + 0.5 * x * (
            there - before + x * (2 * before - 5 * here + 4 * there - after + x * (3 * (here - there) + after - before))
        )
    return np.asarray(np.exp(np.where(np.isfinite(value), value, np.inf)))
