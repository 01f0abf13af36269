"""The adaptive Monte-Carlo method of JCGM 101:2008, clause 7.9, as a source of samples."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

import numpy as np

from pvfeas.laws import Array
from pvfeas.linear import numerical_tolerance
from pvfeas.options import Options
from pvfeas.points import Sample, from_uniforms, shift, uncertain_addresses
from pvfeas.problem import Problem

BATCH = 10_000  # M = max(J, 1e4), J >= 100/(1 - p) for p = 0.9
MOST = 200  # batches


def pseudo_random_samples(problem: Problem, options: Options) -> Iterator[Sample]:
    """Samples of 2, 4, 8, … batches of 1e4 draws; a sample holds all the batches of the one before."""
    batches = 2
    while batches <= MOST and BATCH * batches <= 16 * max(options.maximum_points, 2 * BATCH // 16):
        points = {
            address: np.stack([_batch(options.seed, address, number) for number in range(batches)])
            for address in uncertain_addresses(problem.inputs)
        }
        yield from_uniforms(problem.inputs, problem.correlations, points, (batches, BATCH))
        batches *= 2


def _batch(seed: int, address: str, number: int) -> Array:
    start = int(shift(seed, f"monte-carlo {address}", number) * 2**63)
    return np.asarray(np.random.Generator(np.random.PCG64(start)).random(BATCH))


def settled(batches: Sequence[Array], digits: int = 1) -> bool:
    """JCGM 101:2008, 7.9.4: 2 s <= delta for y, u(y) and both ends of the 95 % interval.

    batches: the model's values, one array per batch; s is the standard deviation of the mean of
    the batch results, delta the numerical tolerance of u(y) over all values.
    """
    rows = np.array([_four(batch) for batch in batches])
    delta = numerical_tolerance(float(np.std(np.concatenate(batches), ddof=1)), digits)
    spread = rows.std(axis=0, ddof=1) / np.sqrt(len(batches))
    return bool(np.all(2.0 * spread <= delta))


def _four(values: Array) -> tuple[float, float, float, float]:
    low, high = np.quantile(values, [0.025, 0.975])
    return float(values.mean()), float(values.std(ddof=1)), float(low), float(high)
