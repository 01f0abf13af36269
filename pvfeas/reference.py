"""What the reference's frequency noise adds to the variance of the splitting seen, by name and against time.

Levels and sums are those of pvfeas.frequency_noise and pvfeas.switching_noise; here they meet a scenario: laser
noise counts photons-fold, a cycle that looks only part of the time lets noise above the cycle's frequency in, a
drift leaves a bias.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from pvfeas.frequency_noise import FLICKER, RANDOM_WALK, level_of_deviation, levels_of_table
from pvfeas.laws import Array
from pvfeas.patterns import Timing, timing
from pvfeas.switching_noise import Passed, flicker_runs, long_run
from pvfeas.tables import Line, Reference, Switching
from pvfeas.techniques.base import Technique

EXACT_RUNS = 100  # patterns up to which flicker noise is summed exactly
Levels = tuple[Array, Array, Array]  # h0, h-1, h-2


def levels_of(reference: Reference, photons: int) -> Levels:
    """h0, h-1, h-2 of the molecule's frequency (Hz^2/Hz, Hz^2, Hz^2 Hz); laser noise × photons^2."""
    zero: Array = np.zeros((1, 1))
    factor = float(photons) ** 2 if reference.of == "laser" else 1.0
    if reference.kind == "drift":
        return zero, zero, zero
    if reference.kind == "table":
        times, deviations = zip(*(reference.table or ()), strict=True)
        white, flicker, walk = levels_of_table(np.array(times), np.array(deviations))
        return np.full((1, 1), white * factor), np.full((1, 1), flicker * factor), np.full((1, 1), walk * factor)
    if reference.h is not None:
        level = np.asarray(reference.h)
    else:
        level = level_of_deviation(reference.kind, np.asarray(reference.allan), reference.at)
    place = ("white", "flicker", "random-walk").index(reference.kind)
    found = [zero, zero, zero]
    found[place] = level * factor
    return found[0], found[1], found[2]


def drift_of(reference: Reference, photons: int) -> Array:
    """Linear drift of the molecule's frequency, Hz/s."""
    if reference.kind != "drift":
        return np.zeros((1, 1))
    return np.asarray(reference.rate) * (photons if reference.of == "laser" else 1)


@dataclass(frozen=True)
class Share:
    """One reference's variance of the splitting seen: falling/elapsed + constant + rising × elapsed; early flicker.

    elapsed: time since the start, dead times included, without pauses of the schedule, s. flicker: h-1, Hz^2.
    """

    name: str
    falling: Array
    constant: Array
    rising: Array
    flicker: Array


@dataclass(frozen=True)
class Passage:
    """Everything the reference adds in one scenario. early: what finite runs add to the flicker sum, by patterns."""

    shares: tuple[Share, ...]
    period: Array  # s of elapsed time; zero where there is no pattern
    letters: int
    live_share: Array  # live time over elapsed time
    early: Array | None = None  # (EXACT_RUNS, …), s: (sum of N patterns) - (sum of a long run)
    detrend: bool = False

    def variance(self, share: Share, elapsed: Array) -> Array:
        """Hz^2 after an elapsed time."""
        at = np.asarray(elapsed)
        with np.errstate(divide="ignore", invalid="ignore"):
            falling = np.where(share.falling == 0, 0.0, share.falling / at) * self.trend(at)
            rising = np.where(share.rising > 0, share.rising * at, 0.0)
        return np.asarray(falling + share.constant + rising + self.correction(share, at))

    def correction(self, share: Share, elapsed: Array) -> Array:
        """What a run of few patterns adds to the long-run variance, Hz^2."""
        if self.early is None or not np.any(share.flicker):
            return np.zeros((1, 1))
        with np.errstate(divide="ignore", invalid="ignore"):
            extra = self._early(elapsed / self.period) / elapsed
        return np.asarray(share.flicker * np.where(np.isfinite(elapsed), extra, 0.0) * self.trend(elapsed))

    def _early(self, patterns: Array) -> Array:
        """The early sum, linear between whole patterns, falling as 1/N beyond the exact ones."""
        assert self.early is not None
        within = np.clip(np.nan_to_num(patterns, posinf=EXACT_RUNS), 1.0, EXACT_RUNS)
        beyond = np.minimum(1.0, EXACT_RUNS / np.maximum(patterns, 1.0))
        if self.early.size == EXACT_RUNS:
            return np.asarray(np.interp(within, np.arange(1, EXACT_RUNS + 1), self.early.ravel()) * beyond)
        shape = np.broadcast_shapes(within.shape, self.early.shape[1:])
        missing = (1,) * (len(shape) + 1 - self.early.ndim)
        table = np.broadcast_to(self.early.reshape(EXACT_RUNS, *missing, *self.early.shape[1:]), (EXACT_RUNS, *shape))
        low = np.broadcast_to(np.minimum(within.astype(np.int64), EXACT_RUNS - 1), shape)[None]
        at_low, at_high = (np.take_along_axis(table, places, axis=0)[0] for places in (low - 1, low))
        return np.asarray((at_low + (within - low[0]) * (at_high - at_low)) * beyond)

    def trend(self, elapsed: Array) -> Array:
        """1 + 3/(N^2 - 1) over N dwells where a linear trend is fitted and removed, else 1 (derived)."""
        if not self.detrend:
            return np.ones((1, 1))
        with np.errstate(divide="ignore"):
            dwells = np.maximum(elapsed / self.period * self.letters, 2.0)
        return np.asarray(1.0 + 3.0 / (dwells**2 - 1.0))


def nothing() -> Passage:
    """No reference noise and no pattern."""
    return Passage((), np.zeros((1, 1)), 1, np.ones((1, 1)))


def passage(
    references: Sequence[Reference], switching: Switching, technique_a: Technique, technique_b: Technique, line: Line
) -> Passage:
    """Put a scenario's references together."""
    if switching.pattern is not None:
        arrays = (np.atleast_2d(np.asarray(one)) for one in (switching.dwell, switching.dead_time, switching.on_a()))
        found = timing(switching.pattern, *arrays)
        return _switched(references, switching, found, technique_a, technique_b, line)
    return replace(nothing(), shares=tuple(_common(each, switching, technique_a, line) for each in references))


def _switched(
    references: Sequence[Reference], switching: Switching, found: Timing, technique_a: Technique,
    technique_b: Technique, line: Line,
) -> Passage:  # fmt: skip
    live_share = np.asarray(found.live / found.period)
    if not references:
        return Passage((), found.period, len(found.pattern), live_share, detrend=switching.detrend)
    passed, on_a = long_run(found), switching.on_a()
    if switching.detrend:
        # a fitted trend takes up 4/5 of what a random walk puts into the bias (derived; least squares confirm it)
        bare = passed.random_walk - 0.8 * 2.0 * np.pi**2 * passed.bias**2
        passed = Passed(passed.white, passed.flicker, bare, np.zeros_like(passed.bias))
    shares = []
    for one in references:
        levels = levels_of(one, line.photons)
        in_a, in_b = (technique.aliased_noise(line, *levels) for technique in (technique_a, technique_b))
        aliased = in_a / on_a + in_b / (1.0 - on_a)
        bias = drift_of(one, line.photons) * passed.bias
        falling = np.asarray(passed.total(*levels) + aliased / live_share)
        shares.append(Share(one.name, falling, np.asarray(bias**2), np.zeros((1, 1)), levels[1]))
    early = flicker_runs(found, EXACT_RUNS) if any(np.any(one.flicker) for one in shares) else None
    return Passage(tuple(shares), found.period, len(found.pattern), live_share, early, switching.detrend)


def _common(reference: Reference, switching: Switching, technique: Technique, line: Line) -> Share:
    """Both enantiomers at once: Allan variance at t over rejection^2, what is aliased included."""
    levels = levels_of(reference, line.photons)
    rejected = 1.0 if switching.rejection is None else np.square(switching.rejection)
    white = levels[0] / 2.0 + technique.aliased_noise(line, *levels)
    return Share(
        reference.name, np.asarray(white / rejected), np.asarray(FLICKER * levels[1] / rejected),
        np.asarray(RANDOM_WALK * levels[2] / rejected), np.zeros((1, 1)),
    )  # fmt: skip
