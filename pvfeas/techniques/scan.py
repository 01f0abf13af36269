"""A scan over the line: the centre from a fit with nuisance parameters."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from typing import Any, ClassVar

import numpy as np

from pvfeas.centre_bounds import COARSE, FREE, kappa
from pvfeas.keys import choice, choices, positive, quantity
from pvfeas.laws import Array
from pvfeas.profiles import profile_of
from pvfeas.switching_noise import aliased_shape
from pvfeas.tables import Line
from pvfeas.techniques.base import Technique


def white_noise_variance(kappa_: Array, fwhm: Array, spacing: Array, snr: Array) -> Array:
    """Variance of the centre in Hz^2: (kappa)^2 FWHM × spacing/SNR^2 (Landman et al. 1982; from memory).

    fwhm, spacing in Hz; snr: peak over rms noise of one point.
    """
    return np.asarray(kappa_**2 * fwhm * spacing / snr**2)


def shot_noise_variance(kappa_: Array, fwhm: Array, spacing: Array, counts: Array) -> Array:
    """Variance of the centre in Hz^2: kappa^2 FWHM × spacing/counts (Bobroff 1986; from memory).

    counts: of the line alone, above background, in one point at its peak.
    """
    return np.asarray(kappa_**2 * fwhm * spacing / counts)


BINS = (np.arange(256) + 0.5) / 256 - 0.5  # along a scan: white noise to 0.5 % up to 40 FWHM


@dataclass(frozen=True)
class Scan(Technique):
    """Points spread evenly over the line, each measured once per cycle, fitted by least squares."""

    kind: ClassVar[str] = "scan"
    summary: ClassVar[str] = "points across the line, the centre from a fit with nuisance parameters"
    needs_width: ClassVar[bool] = True

    snr: Array | None = positive(
        "1", "peak (half peak-to-peak of odd signals) over rms noise of one point (white noise)", example="80 ×/ 1.3"
    )
    snr_time: Array | None = positive("s", "point time that snr belongs to; time/points if absent")
    points: Array = quantity("1", "points of one scan", lower=2.0, required=True, example="60")
    span: Array = positive("Hz", "range of the scan", required=True, along_line=True, example="5 FWHM")
    time: Array = positive("s", "duration of one scan", required=True, example="2 s")
    centre_offset: Array = quantity("Hz", "middle of the scan minus line centre", default="0 Hz", along_line=True)
    free: tuple[str, ...] = choices(
        "parameters of the fit beside the centre", *FREE, default=("amplitude", "width", "baseline")
    )
    noise: str = choice("what limits one point", "white", "shot", default="white")
    counts: Array | None = positive("1", "counts of the line alone in one point at its peak (shot noise)")
    background: Array = quantity("1", "flat background per point as a fraction of counts", lower=0.0, default="0")
    detection: str = choice(
        "what is recorded; the width stays that of the parent line", "direct", "dispersion", "first-derivative",
        default="direct",
    )  # fmt: skip

    @classmethod
    def rules(cls, given: Mapping[str, Any]) -> Iterator[tuple[str, str, str]]:
        """snr belongs to white noise, counts and background to shot noise."""
        if given.get("noise", "white") == "shot":
            if given.get("detection", "direct") in ("dispersion", "first-derivative"):
                yield "noise", "shot noise of what is not counted", 'write detection = "direct", or noise = "white"'
            if "counts" not in given:
                yield "counts", "shot noise without counts", "give the counts of the line in one point at its peak"
            for key in ("snr", "snr_time"):
                if key in given:
                    yield key, f"{key} with shot noise", 'counts say it all: drop it, or write noise = "white"'
            return
        if "snr" not in given:
            yield "snr", "white noise without snr", "give the peak over the rms noise of one point"
        for key in ("counts", "background"):
            if key in given:
                yield key, f"{key} with white noise", 'write noise = "shot", or drop it'

    def cycle_time(self, line: Line) -> Array:
        """Duration of one scan, s."""
        return np.asarray(self.time)

    def spacing(self) -> Array:
        """span/points, Hz."""
        return np.asarray(self.span / self.points)

    def point_snr(self) -> Array:
        """snr grown or shrunk as the root of the point time over snr_time."""
        snr = np.asarray(self.snr)
        if self.snr_time is None:
            return snr
        return np.asarray(snr * np.sqrt(self.time / self.points / self.snr_time))

    def centre_variance(self, line: Line) -> Array:
        """Variance of the line centre after one scan, Hz^2."""
        fwhm = np.asarray(line.width)
        behind = self.background if self.noise == "shot" else None
        factor = kappa(
            line.shape, self.free, np.asarray(self.span / fwhm), np.asarray(self.centre_offset / fwhm),
            np.asarray(self.points), behind, line.lorentzian_share, self.detection,
        )  # fmt: skip
        excess = np.asarray(self.excess_noise) ** 2
        if self.noise == "shot":
            return np.asarray(excess * shot_noise_variance(factor, fwhm, self.spacing(), np.asarray(self.counts)))
        return np.asarray(excess * white_noise_variance(factor, fwhm, self.spacing(), self.point_snr()))

    def aliased_noise(self, line: Line, white: Array, flicker: Array, random_walk: Array) -> Array:
        """Sensitivity as the square of the line's slope along the scan."""
        if not (np.any(white) or np.any(flicker) or np.any(random_walk)):
            return np.zeros((1, 1))
        fwhm = np.atleast_1d(np.asarray(line.width))[..., None]
        along = np.asarray(self.span)[..., None] * BINS + np.asarray(self.centre_offset)[..., None]
        share = None if line.lorentzian_share is None else np.atleast_1d(line.lorentzian_share)[..., None]
        shape = np.square(profile_of(line.shape, share, self.detection).slope(along / fwhm))
        return aliased_shape(shape, self.cycle_time(line), white, flicker, random_walk)

    def interrogation_width(self, line: Line) -> Array | None:
        """The line's full width, Hz."""
        return line.width

    def warnings(self, line: Line) -> tuple[tuple[str, str], ...]:
        """Points too far apart for the bound to hold wherever they lie, or too few of them for the fit."""
        found = []
        if np.any(self.spacing() > COARSE * np.asarray(line.width)):
            message = "points lie further apart than half the FWHM: the bound depends on where they lie"
            found.append(("coarse scan", message))
        parameters = len(set(self.free)) + 1
        if np.any(np.asarray(self.points) < parameters):
            found.append(("too few points", f"a fit of {parameters} parameters needs as many points: none is possible"))
        return tuple(found)
