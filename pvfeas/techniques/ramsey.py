"""Two separated pulses (Ramsey): the phase between a transition and the reference after a free time."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from typing import Any, ClassVar

import numpy as np

from pvfeas.keys import choice, fraction, positive, quantity
from pvfeas.laws import Array
from pvfeas.switching_noise import aliased_uniform
from pvfeas.tables import Line
from pvfeas.techniques.base import Technique


def fringe_contrast(contrast: Array, free_time: Array, coherence_time: Array | None) -> Array:
    """C = contrast × exp(-free_time/coherence_time); no decay without a coherence time (s)."""
    if coherence_time is None:
        return np.asarray(contrast)
    return np.asarray(contrast * np.exp(-free_time / coherence_time))


def both_states_uncertainty(contrast: Array, free_time: Array, molecules: Array, readout_noise: Array) -> Array:
    """Standard uncertainty in Hz of one cycle at mid-fringe, both states counted.

    sqrt(1/(4 N) + (r/N)^2)/(pi C T): projection noise (Itano et al. 1993, Phys. Rev. A 47, 3554; from
    memory), 1/(2 pi C T sqrt N), and the read-out noise r (rms of the counted excited molecules).
    contrast: C at the read-out; free_time: T in s; molecules: N per cycle.
    """
    return np.asarray(np.sqrt(0.25 / molecules + (readout_noise / molecules) ** 2) / (np.pi * contrast * free_time))


def one_state_uncertainty(contrast: Array, free_time: Array, molecules: Array, readout_noise: Array) -> Array:
    """Standard uncertainty in Hz of one cycle at half height, one state counted, molecule number Poisson.

    sqrt(1/(2 N) + (r/N)^2)/(pi C T): sqrt 2 above both states, for the molecule number is not known
    (derived: counts at half height are Poisson with mean N/2). Arguments as for both states.
    """
    return np.asarray(np.sqrt(0.5 / molecules + (readout_noise / molecules) ** 2) / (np.pi * contrast * free_time))


@dataclass(frozen=True)
class Ramsey(Technique):
    """Ramsey fringes read at mid-fringe, by projection of independent molecules."""

    kind: ClassVar[str] = "ramsey"
    summary: ClassVar[str] = "separated pulses: projection noise of molecules over a free time"

    free_time: Array = positive("s", "time between the pulses", required=True, example="0.2 s")
    contrast: Array = fraction("fringe contrast without decay", lower_open=True, required=True, example="0.8(1)")
    coherence_time: Array | None = positive("s", "1/e time of the contrast; no decay if absent", example="1.5(5) s")
    molecules: Array | None = positive("1", "molecules per cycle, of one enantiomer", example="400 ×/ 1.5")
    rate: Array | None = positive("1/s", "molecules per live time of the arm, instead of molecules")
    readout: str = choice("what is counted", "both states", "one state", default="both states")
    readout_noise: Array = quantity("1", "rms noise of the counted excited molecules", lower=0.0, default="0")
    idle_time: Array = quantity(
        "s", "part of the cycle without interrogation", lower=0.0, default="0 s", example="50 ms"
    )

    @classmethod
    def rules(cls, given: Mapping[str, Any]) -> Iterator[tuple[str, str, str]]:
        """Exactly one of molecules and rate."""
        if "molecules" in given and "rate" in given:
            yield "rate", "both molecules and rate", "give one of them"
        if "molecules" not in given and "rate" not in given:
            yield "molecules", "neither molecules nor rate", "give the molecules per cycle, or their rate in 1/s"

    def cycle_time(self, line: Line) -> Array:
        """free_time + idle_time, s."""
        return np.asarray(self.free_time + self.idle_time)

    def molecules_per_cycle(self) -> Array:
        """molecules, or rate × (free_time + idle_time)."""
        if self.molecules is not None:
            return self.molecules
        return np.asarray(np.asarray(self.rate) * (self.free_time + self.idle_time))

    def centre_variance(self, line: Line) -> Array:
        """Variance of one cycle, Hz^2."""
        contrast = fringe_contrast(self.contrast, self.free_time, self.coherence_time)
        one = both_states_uncertainty if self.readout == "both states" else one_state_uncertainty
        sigma = one(contrast, self.free_time, self.molecules_per_cycle(), self.readout_noise)
        return np.asarray((sigma * self.excess_noise) ** 2)

    def aliased_noise(self, line: Line, white: Array, flicker: Array, random_walk: Array) -> Array:
        """Even over the free time, blind in the idle time."""
        cycle = self.cycle_time(line)
        return aliased_uniform(self.free_time / cycle, cycle, white, flicker, random_walk)

    def interrogation_width(self, line: Line) -> Array | None:
        """Full width of the central fringe, 1/(2 T), Hz."""
        return np.asarray(0.5 / self.free_time)
