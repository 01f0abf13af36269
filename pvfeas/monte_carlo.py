"""The adaptive Monte-Carlo method of JCGM 101:2008, clause 7.9."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field

import numpy as np

from pvfeas.laws import Array
from pvfeas.linear import numerical_tolerance
from pvfeas.options import Options
from pvfeas.points import Sample, from_uniforms, shift, uncertain_addresses
from pvfeas.problem import Problem

BATCH = 10_000  # M = max(J, 1e4), J >= 100/(1 - p) for p = 0.95
MOST = 200  # batches
Four = tuple[float, float, float, float]


def trials(problem: Problem, seed: int, batches: Sequence[int]) -> Sample:
    """Pseudo-random draws of every input, one replicate a batch; a batch depends on its number only."""
    points = {
        address: np.stack([_batch(seed, address, number) for number in batches])
        for address in uncertain_addresses(problem.inputs)
    }
    return from_uniforms(problem.inputs, problem.correlations, points, (len(batches), BATCH))


def _batch(seed: int, address: str, number: int) -> Array:
    start = int(shift(seed, f"monte-carlo {address}", number) * 2**63)
    return np.asarray(np.random.Generator(np.random.PCG64(start)).random(BATCH))


def most_batches(options: Options) -> int:
    """The stated maximum: 16 replicates of the most points, at least 2 batches and at most 200."""
    return min(max(16 * options.maximum_points // BATCH, 2), MOST)


def digits_of(tolerance: float) -> int:
    """Significant digits of u(y) that are asked for: 1, and 2 from a tenth of the default tolerances on."""
    return 1 if tolerance > 0.1 else 2


@dataclass
class Trials:
    """The model's values so far, a batch at a time: what the stopping rule needs of them."""

    rows: list[Four] = field(default_factory=list)
    count: int = 0
    mean: float = 0.0
    squares: float = 0.0  # sum of squared deviations from the mean

    def add(self, values: Array) -> None:
        """One more batch; values that are not finite are not counted."""
        kept = values[np.isfinite(values)]
        if kept.size < 2:
            return
        low, high = np.quantile(kept, [0.025, 0.975])
        self.rows.append((float(kept.mean()), float(kept.std(ddof=1)), float(low), float(high)))
        total, step = self.count + kept.size, float(kept.mean()) - self.mean
        self.squares += float(((kept - kept.mean()) ** 2).sum()) + step**2 * self.count * kept.size / total
        self.mean, self.count = self.mean + step * kept.size / total, total

    def settled(self, digits: int) -> bool:
        """JCGM 101:2008, 7.9.4: 2 s <= delta for y, u(y) and both ends of the 95 % interval.

        s is the standard deviation of the mean of the batch results, delta the numerical tolerance of u(y) over
        all values. True where there is nothing to wait for: no value is finite, or all are the same.
        """
        if not self.rows or self.squares == 0.0:
            return True
        if len(self.rows) < 2:
            return False
        delta = numerical_tolerance(float(np.sqrt(self.squares / (self.count - 1))), digits)
        spread = np.array(self.rows).std(axis=0, ddof=1) / np.sqrt(len(self.rows))
        return bool(np.all(2.0 * spread <= delta))
