"""Cramér–Rao bound of a line centre from a scan with nuisance parameters.

sigma = kappa sqrt(FWHM × spacing)/SNR with white noise (SNR: peak over rms of one point) and
sigma = kappa sqrt(FWHM × spacing/counts) with shot noise (counts: of the line alone in one
point at its peak). kappa^2 is the centre's element of the inverse of
M_ij = integral of f_i f_j w dx over the span, x in FWHM, with f = dg/dx for the centre, g, x dg/dx, 1, x
and the Hilbert partner for amplitude, width, baseline, slope and asymmetry, and w = 1 or 1/(g + background).
Landman, Roussel-Dupré & Tanigawa 1982, Astrophys. J. 261, 732 (Gaussian 0.692, infinite span; from
memory); Lorentzian sqrt(2/pi). Shot noise: Bobroff 1986, Rev. Sci. Instrum. 57, 1152 (from memory).

The sum over the points is what counts; the integral stands for it where it is within 1 % (tested): up to
MOST_SUMMED points are summed as they are; of more points that lie further apart than a fifth of the FWHM those
nearest to the line are summed and the integral taken of the rest; of dense points the integral is taken. So
the cost of a draw does not depend on the number of points.
"""

from __future__ import annotations

from collections.abc import Callable
from functools import lru_cache

import numpy as np

from pvfeas.laws import Array
from pvfeas.profiles import Profile, profile_of

FREE = ("amplitude", "width", "baseline", "slope", "asymmetry")
ODD = ("slope", "asymmetry")  # the others do not couple to the centre of a centred scan of a line seen directly
MOST_SUMMED = 64  # points summed at most; nodes of the integral over dense points
DENSE = 0.2  # spacing in FWHM up to which the integral over all points is taken: 3e-4 of the sum for a Lorentzian
WING = 16  # nodes on either side of the summed points of a coarse scan
SUMMED, INTEGRATED, NEAREST = 0, 1, 2  # the three kinds of nodes
COARSE = 0.5  # spacing in FWHM above which the sum depends on where the points happen to lie
LEAST_RATE = 1e-15  # of the peak counts, so that empty points do not weigh infinitely
LEAST_LEFT = 1e-12  # share of the information that is left, times the smallest pivot, below which rounding decides
ROWS = 256  # draws handled together, so that a column stays in the cache
GRAIN = 2.0**40  # ratios of lengths are rounded to 12 digits, so that 5 FWHM of any width is the same 5


def columns(profile: Profile, x: Array, free: tuple[str, ...]) -> list[Array]:
    """Derivatives of the signal by each free nuisance parameter, in the order of FREE, and last by the centre.

    Up to factors that do not matter; x: distance from the centre in FWHM.
    """
    value = profile.value(x)
    slope = profile.slope_from(x, value)
    every: dict[str, Callable[[], list[Array]]] = {
        "amplitude": lambda: [value],
        "width": lambda: profile.widths(x, value, slope),
        "baseline": lambda: [np.ones_like(x)],
        "slope": lambda: [x],
        "asymmetry": lambda: [profile.partner(x)],
    }
    return [column for name in FREE if name in free for column in every[name]()] + [slope]


def information_matrix(vectors: list[Array], weights: Array | None) -> list[list[Array]]:
    """Lower triangle of sum of f_i f_j w over the last axis, without a matrix product."""
    heavy = vectors if weights is None else [one * weights for one in vectors]
    product = np.empty(np.broadcast_shapes(vectors[-1].shape, heavy[-1].shape))

    def entry(i: int, j: int) -> Array:
        return np.asarray(np.multiply(heavy[i], vectors[j], out=product).sum(axis=-1))

    return [[entry(i, j) for j in range(i + 1)] for i in range(len(vectors))]


def centre_information(matrix: list[list[Array]]) -> Array:
    """Information on the last parameter when all others are free too: 1/(inverse matrix)_last,last.

    Symmetric elimination of the matrix scaled to a unit diagonal, element by element. Zero where the
    points cannot tell the parameters apart.
    """
    count = len(matrix)
    scale = [np.sqrt(matrix[i][i]) for i in range(count)]
    with np.errstate(divide="ignore", invalid="ignore", over="ignore"):
        rest = [[matrix[i][j] / scale[i] / scale[j] for j in range(i + 1)] for i in range(count)]
        smallest = np.ones_like(scale[-1])
        for k in range(count - 1):
            smallest = np.minimum(smallest, rest[k][k])
            for i in range(k + 1, count):
                factor = rest[i][k] / rest[k][k]
                for j in range(k + 1, i + 1):
                    rest[i][j] = rest[i][j] - factor * rest[j][k]
        left = rest[-1][-1]
        sound = np.isfinite(left) & (smallest > 0) & (left * smallest > LEAST_LEFT)
    return np.asarray(np.where(sound, np.where(sound, left, 0.0) * scale[-1] ** 2, 0.0))


def summed_places(points: int) -> Array:
    """Where the points lie in units of the span, from -1/2 to 1/2: at the bin centres."""
    return np.asarray((np.arange(points) + 0.5) / points - 0.5)


def summed_nodes(span: Array, offset: Array, points: int, half: bool) -> tuple[Array, Array]:
    """Points x (FWHM) and weights of the sum; half: those above the centre of a centred scan, counted twice."""
    place = summed_places(points)
    if half:
        place = place[(points + 1) // 2 :]
    x = offset[:, None] + span[:, None] * place
    return x, np.asarray(span[:, None] * ((2.0 if half else 1.0) / points))


@lru_cache(maxsize=8)
def legendre(count: int) -> tuple[Array, Array]:
    """Gauss–Legendre nodes and weights on [-1, 1]."""
    nodes, weights = np.polynomial.legendre.leggauss(count)
    return np.asarray(nodes), np.asarray(weights)


def stretched_nodes(start: Array, end: Array, rule: tuple[Array, Array]) -> tuple[Array, Array]:
    """Nodes x (FWHM) and weights of an integral from start to end by a rule for [-1, 1] in u, x = sinh(u)/2.

    64 Gauss–Legendre nodes over a whole span: kappa to 1e-7 at 20 FWHM, 1e-4 at 200, 1e-2 at 2000; worst is
    a Gaussian with shot noise and background. A Lorentzian's centre alone: 1e-5 at 2000.
    """
    nodes, weights = rule
    low, high = np.arcsinh(2.0 * start), np.arcsinh(2.0 * end)
    reach, middle = ((high - low) / 2.0)[:, None], ((high + low) / 2.0)[:, None]
    growth = np.exp(middle + reach * nodes)
    shrinking = 1.0 / growth
    return np.asarray((growth - shrinking) / 4.0), np.asarray(reach / 4.0 * weights * (growth + shrinking))


def dense_nodes(span: Array, offset: Array, half: bool) -> tuple[Array, Array]:
    """Nodes and weights of the integral over the span; half: one side of a centred scan, counted twice."""
    nodes, weights = legendre(MOST_SUMMED)
    if half:
        nodes, weights = nodes[MOST_SUMMED // 2 :], 2.0 * weights[MOST_SUMMED // 2 :]
    return stretched_nodes(offset - span / 2.0, offset + span / 2.0, (nodes, weights))


def nearest_nodes(span: Array, offset: Array, points: Array) -> tuple[Array, Array]:
    """The MOST_SUMMED points nearest to the line, and nodes of the integral over the bins to their left and right."""
    spacing, start = span / points, offset - span / 2.0
    skipped = np.clip(np.rint(-start / spacing) - MOST_SUMMED // 2, 0.0, np.floor(points) - MOST_SUMMED)
    x = start[:, None] + spacing[:, None] * (skipped[:, None] + np.arange(MOST_SUMMED) + 0.5)
    left = stretched_nodes(start, start + skipped * spacing, legendre(WING))
    right = stretched_nodes(start + (skipped + MOST_SUMMED) * spacing, offset + span / 2.0, legendre(WING))
    weights = np.broadcast_to(spacing[:, None], x.shape)
    return np.concatenate([x, left[0], right[0]], axis=1), np.concatenate([weights, left[1], right[1]], axis=1)


def shot_weights(profile: Profile, x: Array, background: Array) -> Array:
    """1/(g + background), the inverse variance of counts relative to the peak of the line alone."""
    return np.asarray(1.0 / np.maximum(profile.value(x) + background, LEAST_RATE))


def kappa(
    profile: str, free: tuple[str, ...], span: Array, offset: Array, points: Array, background: Array | None = None,
    share: Array | None = None, detection: str = "direct",
) -> Array:  # fmt: skip
    """kappa of a scan, infinite where the points cannot tell the free parameters apart.

    That is: fewer points than parameters, or nuisance parameters that raise sigma by a factor of
    thousands (where double precision ends: LEAST_LEFT).

    profile: lorentzian, gaussian or voigt; share: fL/(fL + fG) of a Voigt line, whose two widths are free together;
    detection: direct, dispersion or first-derivative (lorentzian or gaussian); SNR is then half of peak-to-peak;
    free: nuisance parameters; span, offset: in FWHM; points: how
    many; background: counts per point over those of the line at its peak (shot noise), or None (white).
    All broadcast. Each element depends on its own numbers only.
    """
    behind = np.asarray(-1.0 if background is None else background, dtype=float)
    mixed = np.asarray(-1.0 if share is None else share, dtype=float)
    parts = (_grained(span), _grained(offset), np.asarray(points, dtype=float), behind, mixed)
    shape = np.broadcast_shapes(*(part.shape for part in parts))
    if 0 in shape:
        return np.empty(shape)
    if all(part.min() == part.max() for part in parts):
        return np.full(shape, _kappa_at(profile, detection, free, *(float(part.flat[0]) for part in parts)))
    rows = [np.broadcast_to(part, shape).ravel() for part in parts]
    return _kappa_of_rows(profile, detection, free, *rows).reshape(shape)


def _grained(values: Array) -> Array:
    mantissa, exponent = np.frexp(np.asarray(values, dtype=float))
    return np.asarray(np.ldexp(np.rint(mantissa * GRAIN) / GRAIN, exponent))


@lru_cache(maxsize=4096)
def _kappa_at(
    profile: str, detection: str, free: tuple[str, ...], span: float, offset: float, points: float, background: float,
    share: float,
) -> float:  # fmt: skip
    rows = (np.array([one]) for one in (span, offset, points, background, share))
    return float(_kappa_of_rows(profile, detection, free, *rows)[0])


def _kappa_of_rows(
    profile: str, detection: str, free: tuple[str, ...], span: Array, offset: Array, points: Array, background: Array,
    share: Array,
) -> Array:  # fmt: skip
    information = np.empty(span.shape)
    coarse = np.where((points > MOST_SUMMED) & (span > DENSE * points), NEAREST, INTEGRATED)
    kind = np.where((points == np.rint(points)) & (points <= MOST_SUMMED), SUMMED, coarse)
    label = np.where(kind == SUMMED, 3.0 + points, kind)
    centred = (offset == 0) & (detection == "direct")
    for each in _different(label):
        for half in (False, True):
            chosen = np.flatnonzero((label == each) & (centred == half))
            if chosen.size:
                rows = (span[chosen], offset[chosen], points[chosen], background[chosen], share[chosen])
                information[chosen] = _information(profile, detection, free, int(kind[chosen[0]]), half, *rows)
    enough = (points > len(set(free)) + int(profile == "voigt" and "width" in free)) & (information > 0)
    with np.errstate(divide="ignore"):
        return np.asarray(np.where(enough, 1.0 / np.sqrt(information), np.inf))


def _different(values: Array) -> list[float]:
    if values.min() == values.max():
        return [float(values[0])]
    return [float(value) for value in np.unique(values)]


def _nodes(kind: int, half: bool, span: Array, offset: Array, points: Array) -> tuple[Array, Array]:
    if kind == SUMMED:
        return summed_nodes(span, offset, int(points[0]), half)
    return nearest_nodes(span, offset, points) if kind == NEAREST else dense_nodes(span, offset, half)


def _information(
    name: str, detection: str, free: tuple[str, ...], kind: int, half: bool, span: Array, offset: Array, points: Array,
    background: Array, share: Array,
) -> Array:  # fmt: skip
    """Information on the centre of draws that share their kind of nodes; half: all of them centred."""
    coupled = tuple(name for name in FREE if name in free and (name in ODD or not half))
    white = bool(background[0] < 0)
    flat = white and kind == SUMMED  # all weights of a draw are equal
    size = len(coupled) + 1 + int(name == "voigt" and "width" in coupled)
    matrix = [[np.empty(span.shape) for _ in range(i + 1)] for i in range(size)]
    for start in range(0, span.size, ROWS):
        rows = slice(start, start + ROWS)
        x, weights = _nodes(kind, half, span[rows], offset[rows], points[rows])
        profile = profile_of(name, share[rows, None], detection)
        if not white:
            weights = weights * shot_weights(profile, x, background[rows, None])
        found = information_matrix(columns(profile, x, coupled), None if flat else weights)
        for i in range(size):
            for j in range(i + 1):
                matrix[i][j][rows] = found[i][j] * weights[:, 0] if flat else found[i][j]
    return centre_information(matrix)
