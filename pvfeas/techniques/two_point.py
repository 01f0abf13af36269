"""Two points on the sides of the line, at plus and minus a depth: the centre from their difference."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping
from dataclasses import dataclass
from typing import Any, ClassVar

import numpy as np

from pvfeas.keys import choice, fraction, positive, quantity
from pvfeas.laws import Array
from pvfeas.line import Line
from pvfeas.profiles import Profile, profile_of
from pvfeas.techniques.base import Technique

GOLDEN = (np.sqrt(5.0) - 1.0) / 2.0
NARROWINGS = 40  # of ln(depth) from 1e-4 to 3 FWHM: 5e-8, below 1e-14 of the variance at its minimum
SHALLOWEST, DEEPEST = 1e-4, 3.0  # FWHM


def white_pair_variance(profile: Profile, depth: Array, snr: Array) -> Array:
    """1/(2 SNR^2 g'(m)^2) in FWHM^2: two samples of rms 1/SNR of the peak, difference slope 2 g' (derived).

    Lorentzian at m = 1/(2 sqrt 3): (0.5443/SNR)^2. depth m in FWHM; snr of one sample.
    """
    return np.asarray(0.5 / (snr * profile.slope(depth)) ** 2)


def shot_pair_variance(profile: Profile, depth: Array, counts: Array, background: Array) -> Array:
    """(g + b)/(2 N g'^2) in FWHM^2: Poisson counts N (g + b) in each sample (derived).

    counts N: of the line alone in one sample at its peak; background b: flat, a fraction of counts.
    """
    return np.asarray((profile.value(depth) + background) / (2.0 * counts * profile.slope(depth) ** 2))


def projection_pair_variance(profile: Profile, depth: Array, molecules: Array, contrast: Array) -> Array:
    """p (1 - p)/(N C^2 g'^2) in FWHM^2, p = C g: N molecules a pair, half on each side (derived)."""
    value = contrast * profile.value(depth)
    return np.asarray(value * (1.0 - value) / (molecules * (contrast * profile.slope(depth)) ** 2))


def best_depth(variance: Callable[[Array], Array], shape: tuple[int, ...]) -> Array:
    """The depth in FWHM of least variance, by golden section of ln(depth), element by element."""
    low, high = np.full(shape, np.log(SHALLOWEST)), np.full(shape, np.log(DEEPEST))
    left, right = high - GOLDEN * (high - low), low + GOLDEN * (high - low)
    at_left, at_right = variance(np.exp(left)), variance(np.exp(right))
    for _ in range(NARROWINGS):
        lower = at_left < at_right
        low, high = np.where(lower, low, left), np.where(lower, right, high)
        new = np.where(lower, high - GOLDEN * (high - low), low + GOLDEN * (high - low))
        at_new = variance(np.exp(new))
        left, right = np.where(lower, new, right), np.where(lower, left, new)
        at_left, at_right = np.where(lower, at_new, at_right), np.where(lower, at_left, at_new)
    return np.asarray(np.exp((low + high) / 2.0))


OWN = {"snr": "white", "counts": "shot", "background": "shot", "molecules": "projection", "contrast": "projection"}


@dataclass(frozen=True)
class TwoPoint(Technique):
    """One sample on each side of the line; nothing else is free."""

    kind: ClassVar[str] = "two-point"
    summary: ClassVar[str] = "one point on each side of the line, the centre from their difference"
    needs_width: ClassVar[bool] = True

    snr: Array | None = positive("1", "peak over rms noise of one sample (white noise)", example="80 ×/ 1.3")
    depth: Array | None = positive(
        "Hz", "distance of each point from the centre; the best one if absent", along_line=True
    )
    time: Array = positive("s", "duration of one pair of samples", required=True, example="0.2 s")
    noise: str = choice("what limits a sample", "white", "shot", "projection", default="white")
    counts: Array | None = positive("1", "counts of the line alone in one sample at its peak (shot noise)")
    background: Array = quantity("1", "flat background per sample as a fraction of counts", lower=0.0, default="0")
    molecules: Array | None = positive("1", "molecules per pair, of one enantiomer (projection noise)")
    contrast: Array = fraction("transition probability at the peak (projection noise)", lower_open=True, default="1")

    @classmethod
    def rules(cls, given: Mapping[str, Any]) -> Iterator[tuple[str, str, str]]:
        """snr belongs to white noise, counts to shot noise, molecules to projection noise."""
        noise = given.get("noise", "white")
        needed = {"white": "snr", "shot": "counts", "projection": "molecules"}.get(noise)
        if needed is None:
            return
        if needed not in given:
            yield needed, f"{noise} noise without {needed}", f"write {needed} = …"
        for key, own in OWN.items():
            if key in given and noise != own:
                yield key, f"{key} with {noise} noise", f'write noise = "{own}", or drop it'

    def cycle_time(self, line: Line) -> Array:
        """Duration of one pair, s."""
        return np.asarray(self.time)

    def _variance(self, profile: Profile, depth: Array) -> Array:
        if self.noise == "shot":
            return shot_pair_variance(profile, depth, np.asarray(self.counts)[..., None], self.background[..., None])
        if self.noise == "projection":
            molecules = np.asarray(self.molecules)[..., None]
            return projection_pair_variance(profile, depth, molecules, self.contrast[..., None])
        return white_pair_variance(profile, depth, np.asarray(self.snr)[..., None])

    def centre_variance(self, line: Line) -> Array:
        """Variance of the line centre after one pair, Hz^2."""
        fwhm = np.asarray(line.width)
        share = line.lorentzian_share
        profile = profile_of(line.shape, None if share is None else np.asarray(share)[..., None])
        if self.depth is not None:
            depth = np.asarray(self.depth / fwhm)[..., None]
        else:
            numbers = [np.asarray(one)[..., None] for one in (self.background, self.contrast) if one is not None]
            numbers += [] if share is None else [np.asarray(share)[..., None]]
            shape = np.broadcast_shapes((1,), *(one.shape for one in numbers))
            unit = np.ones((1,))
            depth = best_depth(lambda m: self._unit_variance(profile, m, unit), shape)
        return np.asarray(self._variance(profile, depth)[..., 0] * (fwhm * self.excess_noise) ** 2)

    def _unit_variance(self, profile: Profile, depth: Array, unit: Array) -> Array:
        """The variance for one count, one molecule or snr 1: what the best depth depends on."""
        if self.noise == "shot":
            return shot_pair_variance(profile, depth, unit, self.background[..., None])
        if self.noise == "projection":
            return projection_pair_variance(profile, depth, unit, self.contrast[..., None])
        return white_pair_variance(profile, depth, unit)

    def interrogation_width(self, line: Line) -> Array | None:
        """The line's full width, Hz."""
        return line.width
