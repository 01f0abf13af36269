"""Laws and the bounds of the fields that use them: what is impossible is refused or cut, never ignored."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from pvfeas.errors import QuantityError
from pvfeas.keys import Key
from pvfeas.laws import Exact, Law, Normal, Uniform, bounded_beta, truncated
from pvfeas.showing import digits, value_text

REFUSED, WARNED = 0.05, 0.001  # probability beyond a bound
NOTHING = 5e-17  # below what a draw can reach


@dataclass(frozen=True)
class Bounds:
    """What all uses of an input together allow."""

    lower: float = -np.inf
    upper: float = np.inf
    lower_open: bool = False
    upper_open: bool = False
    unit: str = "1"

    @classmethod
    def of(cls, key: Key) -> Bounds:
        """The bounds of a field."""
        return cls(key.lower, key.upper, key.lower_open, key.upper_open, key.unit)

    def sign_only(self) -> Bounds:
        """What a factor of a product must keep: its sign."""
        return Bounds(0.0, np.inf, False, False, "1") if self.lower >= 0.0 else Bounds()

    def both(self, other: Bounds) -> Bounds:
        """The intersection."""
        low, high = max(self.lower, other.lower), min(self.upper, other.upper)
        low_open = any(one.lower_open for one in (self, other) if one.lower == low)
        high_open = any(one.upper_open for one in (self, other) if one.upper == high)
        return Bounds(low, high, low_open, high_open, self.unit if self.unit != "1" else other.unit)

    def text(self) -> str:
        """The bounds in words."""
        low = f"{'above' if self.lower_open else 'at least'} {self._one(self.lower)}"
        high = f"{'below' if self.upper_open else 'at most'} {self._one(self.upper)}"
        if np.isinf(self.lower):
            return high
        return low if np.isinf(self.upper) else f"{low} and {high}"

    def _one(self, value: float) -> str:
        return f"{value:g}" if self.unit == "1" or value == 0 else value_text(value, self.unit)

    def contain(self, value: float) -> bool:
        """Whether an exact value is allowed."""
        low = value > self.lower or (value == self.lower and not self.lower_open)
        return low and (value < self.upper or (value == self.upper and not self.upper_open))


def fitted(law: Law, bounds: Bounds, text: str) -> tuple[Law, float]:
    """The law inside the bounds and the probability that was cut away.

    A normal law between two bounds becomes the beta law of the same mean and standard deviation. Raises
    QuantityError where more than 5 % lie beyond, naming the tail and a law that fits.
    """
    if isinstance(law, Exact):
        if not bounds.contain(law.value):
            raise QuantityError(f'"{text}" is out of bounds', f"a value {bounds.text()} is needed")
        return law, 0.0
    if isinstance(law, Normal) and np.isfinite(bounds.lower) and np.isfinite(bounds.upper):
        return bounded_beta(law.mean, law.sd, bounds.lower, bounds.upper), 0.0
    if isinstance(law, Uniform) and bounds.lower_open and law.lower == bounds.lower:
        return law, 0.0
    cut, below, above = truncated(law, bounds.lower, bounds.upper)
    if below + above > REFUSED:
        tail, part = ("below", below) if below >= above else ("above", above)
        end = bounds.lower if below >= above else bounds.upper
        raise QuantityError(
            f'{100 * part:.2g} % of "{text}" lie {tail} {digits(end)}',
            f"a value {bounds.text()} is needed; {better(law, bounds)}",
        )
    return (law, 0.0) if below + above < NOTHING else (cut, below + above)


def better(law: Law, bounds: Bounds) -> str:
    """A law that fits, in words."""
    if bounds.lower == 0.0 and law.median > 0.0:
        high = float(law.from_score(1.0))
        return f"a lognormal law fits: median ×/ {max(high / law.median, 1.01):.3g}"
    if np.isfinite(bounds.lower) and np.isfinite(bounds.upper):
        return f"a range fits: {bounds.lower:g} .. {bounds.upper:g}"
    far = float(law.from_score(2.0 if np.isfinite(bounds.lower) else -2.0))
    if bounds.lower < far < bounds.upper:
        ends = (bounds.lower, far) if np.isfinite(bounds.lower) else (far, bounds.upper)
        return f"a range fits: {ends[0]:.3g} .. {ends[1]:.3g}"
    return "write a smaller spread"


def relative_spread(law: Law) -> float:
    """du/u of an uncertainty given as a law: ln of the factor, or half the 16–84 % range over the median."""
    low, high = (float(value) for value in law.from_score(np.array([-1.0, 1.0])))
    if isinstance(law, Exact) or low == high or law.median == 0.0:
        return 0.0
    if isinstance(law, Normal):
        return law.sd / abs(law.mean)
    if type(law).__name__ == "Lognormal":
        return float(np.log(high / law.median))
    return (high - low) / (2.0 * abs(law.median))
