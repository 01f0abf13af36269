"""The laws an input can follow, as numbers.

Every law is a frozen dataclass with the same verbs; arguments broadcast. from_score takes
standard normal scores z (so that a Gaussian copula can tie laws), quantile takes
probabilities, below and above are P(x < value) and P(x > value).
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from functools import lru_cache
from typing import Protocol

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy import special

from pvfeas.errors import QuantityError

Array = NDArray[np.float64]


class Law(Protocol):
    """What every law can do."""

    @property
    def median(self) -> float:
        """The value at score 0."""

    @property
    def lower(self) -> float:
        """The lower end of the support."""

    @property
    def upper(self) -> float:
        """The upper end of the support."""

    def from_score(self, score: ArrayLike) -> Array:
        """The value at standard normal score z, that is at probability Phi(z)."""

    def quantile(self, probability: ArrayLike) -> Array:
        """The value below which the given probability lies."""

    def below(self, value: ArrayLike) -> Array:
        """P(x < value)."""

    def above(self, value: ArrayLike) -> Array:
        """P(x > value), without cancellation in the upper tail."""


class _Scored:
    """A law with x = f(z) for a standard normal score z."""

    def from_score(self, score: ArrayLike) -> Array:
        """The value at standard normal score z."""
        raise NotImplementedError

    def score(self, value: ArrayLike) -> Array:
        """The score of a value, infinite outside the support."""
        raise NotImplementedError

    def quantile(self, probability: ArrayLike) -> Array:
        """The value below which the given probability lies."""
        return self.from_score(special.ndtri(np.asarray(probability, dtype=float)))

    def below(self, value: ArrayLike) -> Array:
        """P(x < value)."""
        return np.asarray(special.ndtr(self.score(value)))

    def above(self, value: ArrayLike) -> Array:
        """P(x > value)."""
        return np.asarray(special.ndtr(-self.score(value)))


class _Uniformed(_Scored):
    """A law with x = f(u) for a uniform probability u; median from quantile(1/2)."""

    def from_score(self, score: ArrayLike) -> Array:
        """The value at standard normal score z."""
        return self.quantile(special.ndtr(np.asarray(score, dtype=float)))

    def score(self, value: ArrayLike) -> Array:
        """The score of a value, infinite outside the support; the nearer tail decides."""
        low, high = self.below(value), self.above(value)
        return np.asarray(np.where(low < high, special.ndtri(low), -special.ndtri(high)))


class _Unbounded(_Scored):
    """A law on the whole line."""

    @property
    def lower(self) -> float:
        """The lower end of the support."""
        return -np.inf

    @property
    def upper(self) -> float:
        """The upper end of the support."""
        return np.inf


@dataclass(frozen=True)
class Exact(_Scored):
    """One value, no uncertainty."""

    value: float

    @property
    def median(self) -> float:
        """The value."""
        return self.value

    @property
    def lower(self) -> float:
        """The value."""
        return self.value

    @property
    def upper(self) -> float:
        """The value."""
        return self.value

    def from_score(self, score: ArrayLike) -> Array:
        """The value, whatever the score."""
        return np.full(np.shape(score), self.value)

    def below(self, value: ArrayLike) -> Array:
        """1 above the value, else 0."""
        return np.asarray(self.value < np.asarray(value), dtype=float)

    def above(self, value: ArrayLike) -> Array:
        """1 below the value, else 0."""
        return np.asarray(self.value > np.asarray(value), dtype=float)


@dataclass(frozen=True)
class Normal(_Unbounded):
    """Mean and standard deviation; relative: written as a fraction of the mean."""

    mean: float
    sd: float
    relative: bool = False

    @property
    def median(self) -> float:
        """The mean."""
        return self.mean

    def from_score(self, score: ArrayLike) -> Array:
        """mean + sd z."""
        return np.asarray(self.mean + self.sd * np.asarray(score))

    def score(self, value: ArrayLike) -> Array:
        """(x - mean)/sd."""
        return np.asarray((np.asarray(value) - self.mean) / self.sd)


@dataclass(frozen=True)
class TwoPiece(_Unbounded):
    """median - below |z| for z < 0, median + above z for z > 0: 16 and 84 % lie one piece away."""

    median: float
    minus: float
    plus: float

    def from_score(self, score: ArrayLike) -> Array:
        """The value at standard normal score z."""
        z = np.asarray(score)
        return np.asarray(self.median + np.where(z < 0, self.minus, self.plus) * z)

    def score(self, value: ArrayLike) -> Array:
        """Distance from the median in pieces."""
        distance = np.asarray(value) - self.median
        return np.asarray(distance / np.where(distance < 0, self.minus, self.plus))


@dataclass(frozen=True)
class Lognormal(_Scored):
    """median × factor^z; a negative median keeps its sign."""

    median: float
    factor: float

    @property
    def lower(self) -> float:
        """0, or minus infinity for a negative median."""
        return 0.0 if self.median > 0 else -np.inf

    @property
    def upper(self) -> float:
        """Infinity, or 0 for a negative median."""
        return np.inf if self.median > 0 else 0.0

    def from_score(self, score: ArrayLike) -> Array:
        """The value at standard normal score z (mirrored for a negative median)."""
        sign = 1.0 if self.median > 0 else -1.0
        return np.asarray(self.median * np.exp(sign * np.log(self.factor) * np.asarray(score)))

    def score(self, value: ArrayLike) -> Array:
        """ln(x/median)/ln(factor), infinite on the wrong side of zero."""
        sign = 1.0 if self.median > 0 else -1.0
        ratio = np.maximum(np.asarray(value) / self.median, 0.0)
        with np.errstate(divide="ignore"):
            return np.asarray(sign * np.log(ratio) / np.log(self.factor))


@dataclass(frozen=True)
class Uniform(_Uniformed):
    """Uniform between two ends."""

    lower: float
    upper: float

    @property
    def median(self) -> float:
        """The middle."""
        return (self.lower + self.upper) / 2.0

    def quantile(self, probability: ArrayLike) -> Array:
        """Linear in the probability."""
        return np.asarray(self.lower + (self.upper - self.lower) * np.asarray(probability))

    def below(self, value: ArrayLike) -> Array:
        """P(x < value)."""
        return np.clip((np.asarray(value) - self.lower) / (self.upper - self.lower), 0.0, 1.0)

    def above(self, value: ArrayLike) -> Array:
        """P(x > value)."""
        return np.clip((self.upper - np.asarray(value)) / (self.upper - self.lower), 0.0, 1.0)


@dataclass(frozen=True)
class LogUniform(_Uniformed):
    """ln x uniform between two positive ends."""

    lower: float
    upper: float

    @property
    def median(self) -> float:
        """The geometric middle."""
        return float(np.sqrt(self.lower * self.upper))

    def _inner(self) -> Uniform:
        return Uniform(float(np.log(self.lower)), float(np.log(self.upper)))

    def quantile(self, probability: ArrayLike) -> Array:
        """lower × (upper/lower)^u."""
        return np.asarray(self.lower * np.exp(np.log(self.upper / self.lower) * np.asarray(probability)))

    def below(self, value: ArrayLike) -> Array:
        """P(x < value)."""
        return self._inner().below(np.log(np.maximum(value, self.lower)))

    def above(self, value: ArrayLike) -> Array:
        """P(x > value)."""
        return self._inner().above(np.log(np.maximum(value, self.lower)))


@dataclass(frozen=True)
class Beta(_Uniformed):
    """The beta law on [lower, upper] with this mean and standard deviation."""

    mean: float
    sd: float
    lower: float
    upper: float

    def shapes(self) -> tuple[float, float]:
        """a and b: with m, s on the unit interval, a = m (m (1 - m)/s^2 - 1), b = a (1 - m)/m."""
        width = self.upper - self.lower
        m, s = (self.mean - self.lower) / width, self.sd / width
        size = m * (1.0 - m) / s**2 - 1.0
        return m * size, (1.0 - m) * size

    @property
    def median(self) -> float:
        """The value at probability 1/2."""
        return float(self.quantile(0.5))

    def quantile(self, probability: ArrayLike) -> Array:
        """Inverse of the regularised incomplete beta function."""
        a, b = self.shapes()
        return np.asarray(
            self.lower + (self.upper - self.lower) * special.betaincinv(a, b, np.asarray(probability, dtype=float))
        )

    def from_score(self, score: ArrayLike) -> Array:
        """The value at standard normal score z, from a table that is exact to 1e-10 of the range."""
        table, step = _beta_table(self)
        place = (np.clip(score, -TABLE_END, TABLE_END) + TABLE_END) / step
        left = np.minimum(place.astype(np.int64), table.shape[1] - 2)
        x = place - left
        here, there, rise, fall = table[0][left], table[0][left + 1], table[1][left], table[1][left + 1]
        bend = x * (1.0 - x) * ((rise - there + here) * (1.0 - x) - (fall - there + here) * x)
        return np.asarray(here + x * (there - here) + bend)

    def _unit(self, value: ArrayLike) -> Array:
        return np.clip((np.asarray(value) - self.lower) / (self.upper - self.lower), 0.0, 1.0)

    def below(self, value: ArrayLike) -> Array:
        """P(x < value)."""
        return np.asarray(special.betainc(*self.shapes(), self._unit(value)))

    def above(self, value: ArrayLike) -> Array:
        """P(x > value)."""
        return np.asarray(special.betaincc(*self.shapes(), self._unit(value)))


TABLE_END, TABLE_STEPS = 8.5, 1024


@lru_cache(maxsize=256)
def _beta_table(law: Beta) -> tuple[Array, float]:
    """Values and slopes × step of x against z on a regular grid (cubic Hermite interpolation)."""
    z = np.linspace(-TABLE_END, TABLE_END, TABLE_STEPS + 1)
    step = float(z[1] - z[0])
    a, b = law.shapes()
    unit = np.where(z < 0, special.betaincinv(a, b, special.ndtr(z)), special.betainccinv(a, b, special.ndtr(-z)))
    rest = np.where(z < 0, special.betainccinv(b, a, special.ndtr(z)), special.betaincinv(b, a, special.ndtr(-z)))
    inner = (unit > 0) & (rest > 0)
    density = (a - 1) * np.log(np.where(inner, unit, 1.0)) + (b - 1) * np.log(np.where(inner, rest, 1.0))
    slope = np.where(inner, np.exp(-0.5 * z * z - density + special.betaln(a, b)) / np.sqrt(2 * np.pi), 0.0)
    width = law.upper - law.lower
    return np.stack([law.lower + width * unit, width * slope * step]), step


@dataclass(frozen=True)
class Truncated(_Uniformed):
    """Another law cut at two ends and renormalised."""

    base: Law
    lower: float
    upper: float

    @property
    def median(self) -> float:
        """The value at probability 1/2."""
        return float(self.quantile(0.5))

    def quantile(self, probability: ArrayLike) -> Array:
        """The base's value at the probability that is left, from the nearer tail."""
        u = np.asarray(probability, dtype=float)
        return self._from_tails(u, 1.0 - u)

    def from_score(self, score: ArrayLike) -> Array:
        """The value at standard normal score z."""
        z = np.asarray(score, dtype=float)
        return self._from_tails(special.ndtr(z), special.ndtr(-z))

    def _from_tails(self, below: Array, above: Array) -> Array:
        low, high = float(self.base.below(self.lower)), float(self.base.above(self.upper))
        kept = 1.0 - low - high
        from_top, from_bottom = -special.ndtri(high + above * kept), special.ndtri(low + below * kept)
        return np.clip(self.base.from_score(np.where(below > 0.5, from_top, from_bottom)), self.lower, self.upper)

    def below(self, value: ArrayLike) -> Array:
        """P(x < value)."""
        low, high = self.base.below(self.lower), self.base.above(self.upper)
        return np.asarray(np.clip((self.base.below(value) - low) / (1.0 - low - high), 0.0, 1.0))

    def above(self, value: ArrayLike) -> Array:
        """P(x > value)."""
        low, high = self.base.below(self.lower), self.base.above(self.upper)
        return np.asarray(np.clip((self.base.above(value) - high) / (1.0 - low - high), 0.0, 1.0))


def truncated(law: Law, lower: float, upper: float) -> tuple[Law, float, float]:
    """The law cut to [lower, upper], and the probabilities that lay below and above."""
    below, above = float(law.below(lower)), float(law.above(upper))
    if below == 0.0 and above == 0.0:
        return law, 0.0, 0.0
    return Truncated(law, max(lower, law.lower), min(upper, law.upper)), below, above


def bounded_beta(mean: float, sd: float, lower: float, upper: float) -> Beta:
    """The beta law of a quantity with two bounds; QuantityError where none has this mean and spread."""
    if not lower < mean < upper:
        raise QuantityError(
            f"the mean {mean:.6g} does not lie between {lower:.6g} and {upper:.6g}",
            "a spread needs a mean inside the bounds; write the value without a spread, or a range",
        )
    largest = float(np.sqrt((mean - lower) * (upper - mean)))
    if sd >= largest:
        raise QuantityError(
            f"no law between {lower:.6g} and {upper:.6g} has mean {mean:.6g} and standard deviation {sd:.6g}",
            f"the standard deviation must be below {largest:.3g}",
        )
    return Beta(mean, sd, lower, upper)


def scaled(law: Law, factor: float) -> Law:
    """The law of factor × x for a positive factor: a change of unit."""
    if isinstance(law, Exact):
        return Exact(law.value * factor)
    if isinstance(law, Normal):
        return replace(law, mean=law.mean * factor, sd=law.sd * factor)
    if isinstance(law, TwoPiece):
        return TwoPiece(law.median * factor, law.minus * factor, law.plus * factor)
    if isinstance(law, Lognormal):
        return replace(law, median=law.median * factor)
    if isinstance(law, Uniform):
        return Uniform(law.lower * factor, law.upper * factor)
    if isinstance(law, LogUniform):
        return LogUniform(law.lower * factor, law.upper * factor)
    if isinstance(law, Beta):
        return Beta(law.mean * factor, law.sd * factor, law.lower * factor, law.upper * factor)
    if isinstance(law, Truncated):
        return Truncated(scaled(law.base, factor), law.lower * factor, law.upper * factor)
    raise TypeError(f"no law called {type(law).__name__}")
