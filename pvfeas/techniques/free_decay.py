"""A freely decaying oscillation, recorded and fitted: frequency, amplitude and phase unknown."""

from __future__ import annotations

from dataclasses import dataclass
from typing import ClassVar

import numpy as np
from scipy import special

from pvfeas.keys import flag, positive, quantity
from pvfeas.laws import Array
from pvfeas.line import Line
from pvfeas.switching_noise import aliased_part
from pvfeas.techniques.base import Technique

SMALL = 0.5  # record over half the decay time below which a series replaces differences of exponentials
COEFFICIENTS = [2.0 / float(special.factorial(2 * k)) for k in range(2, 12)]
BINS = (np.arange(64) + 0.5) / 64  # of a record


def decay_penalty(record: Array, decay_time: Array) -> Array:
    """C = z^3 (1 - e^-z)/(12 [1 - (z^2 + 2) e^-z + e^-2z]), z = 2 record/decay_time: what damping costs in variance.

    1 for a record much shorter than the decay (Yao & Pandit 1995, IEEE Trans. Signal Process. 43, 878, from memory;
    derived). record, decay_time (of the amplitude) in s. The bracket is 2 e^-z Σ_{k>=2} z^2k/(2k)! for small z.
    """
    z = np.asarray(2.0 * record / decay_time)
    series: Array = np.zeros(())
    for coefficient in COEFFICIENTS[::-1]:
        series = series * z * z + coefficient
    with np.errstate(divide="ignore", invalid="ignore", over="ignore"):
        small = special.exprel(-z) / (12.0 * np.exp(-z) * series)
        large = z * z * z * (1.0 - np.exp(-z)) / (12.0 * (1.0 - (z * z + 2.0) * np.exp(-z) + np.exp(-2.0 * z)))
    return np.asarray(np.where(z < SMALL, small, large))


def tone_variance(record: Array, decay_time: Array, snr: Array, sample_interval: Array, quadrature: bool) -> Array:
    """Variance in Hz^2 of the frequency of one record: 24 dt C/((2 pi)^2 SNR^2 T^3), half of it with both quadratures.

    Rife & Boorstyn 1974, IEEE Trans. Inf. Theory 20, 591 (from memory), phase and amplitude unknown, for many samples.
    snr: initial amplitude over rms noise of one sample (of each quadrature); times in s.
    """
    size = 12.0 if quadrature else 24.0
    penalty = decay_penalty(record, decay_time)
    return np.asarray(size * sample_interval * penalty / ((2.0 * np.pi * snr) ** 2 * record * record * record))


def record_sensitivity(time: Array, record: Array, decay_time: Array) -> Array:
    """How much the fitted frequency follows the frequency at each time of the record, up to a factor; zero outside.

    ∫_t^T (u - m) e^{-2u/T2} du with m the weighted middle of the record: the phase of the oscillation enters with
    weight (u - m) e^{-2u/T2} (derived).
    """
    rate = 2.0 / decay_time
    with np.errstate(over="ignore"):
        middle = 1.0 / rate - record / special.expm1(rate * record)
        inner = np.exp(-rate * time) * ((time - middle) / rate + 1.0 / rate**2)
        outer = np.exp(-rate * record) * ((record - middle) / rate + 1.0 / rate**2)
    return np.asarray(np.where(time < record, np.maximum(inner - outer, 0.0), 0.0))


@dataclass(frozen=True)
class FreeDecay(Technique):
    """Free decay of a coherence after a pulse; the phase is not known."""

    kind: ClassVar[str] = "free-decay"
    summary: ClassVar[str] = "a decaying oscillation, recorded and fitted; phase unknown"

    decay_time: Array = positive("s", "1/e time of the amplitude", required=True, example="40(5) ms")
    record: Array = positive("s", "length of the record", required=True, example="80 ms")
    snr: Array = positive("1", "initial amplitude over rms noise of one sample", required=True, example="5 ×/ 1.3")
    sample_interval: Array = positive("s", "time between samples", required=True, example="10 µs")
    quadrature: bool = flag("whether both quadratures are recorded, each with that noise")
    idle_time: Array = quantity("s", "part of the cycle without record", lower=0.0, default="0 s", example="20 ms")

    def cycle_time(self, line: Line) -> Array:
        """record + idle_time, s."""
        return np.asarray(self.record + self.idle_time)

    def centre_variance(self, line: Line) -> Array:
        """Variance of one record, Hz^2."""
        found = tone_variance(self.record, self.decay_time, self.snr, self.sample_interval, self.quadrature)
        return np.asarray(found * np.asarray(self.excess_noise) ** 2)

    def interrogation_width(self, line: Line) -> Array | None:
        """Full width of the Lorentzian line, 1/(pi T2), Hz."""
        return np.asarray(1.0 / (np.pi * self.decay_time))

    def aliased_noise(self, line: Line, white: Array, flicker: Array, random_walk: Array) -> Array:
        """Sensitivity along the record, none in the idle time."""
        cycle, record = self.cycle_time(line), np.asarray(self.record)[..., None]
        shape = record_sensitivity(BINS * record, record, np.asarray(self.decay_time)[..., None])
        return aliased_part(shape, self.record / cycle, cycle, white, flicker, random_walk)

    def warnings(self, line: Line) -> tuple[tuple[str, str], ...]:
        """Fewer samples than the bound needs."""
        if np.any(self.record < 20.0 * self.sample_interval):
            return (("few samples", "fewer than 20 samples in a record: the bound for many samples is too low"),)
        return ()
