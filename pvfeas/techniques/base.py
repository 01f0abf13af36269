"""What every technique is: one frozen dataclass of arrays with a few verbs."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from typing import Any, ClassVar

import numpy as np

from pvfeas.keys import quantity
from pvfeas.laws import Array
from pvfeas.tables import Line


@dataclass(frozen=True)
class Technique:
    """One way to find the frequency of one enantiomer, described for one cycle.

    Attributes are arrays that broadcast over draws, in Hz, s, kg, m, K, Pa, or plain options.
    """

    kind: ClassVar[str]
    summary: ClassVar[str]
    arms: ClassVar[int] = 2  # 1: one sample holds both enantiomers
    needs_width: ClassVar[bool] = False  # the line's fwhm is required
    has_cycles: ClassVar[bool] = True  # at least one whole cycle on each arm before there is a result

    excess_noise: Array = quantity(
        "1", "amplitude of the noise over the ideal one", lower=1.0, default="1", example="1.2"
    )

    @classmethod
    def rules(cls, given: Mapping[str, Any]) -> Iterator[tuple[str, str, str]]:
        """What is wrong with the keys taken together: (key, what was found, what would be right).

        given: every key of the table that was written, options with their value.
        """
        yield from ()

    @property
    def states_splitting(self) -> bool:
        """Whether centre_variance is already that of the splitting, both arms together."""
        return False

    def cycle_time(self, line: Line) -> Array:
        """Duration of one cycle in s, idle time included."""
        raise NotImplementedError

    def centre_variance(self, line: Line) -> Array:
        """Variance of the line centre of one enantiomer after one cycle, in Hz^2, excess noise included."""
        raise NotImplementedError

    def interrogation_width(self, line: Line) -> Array | None:
        """Full width in Hz that systematics and resolution refer to; None where there is none."""
        raise NotImplementedError

    def aliased_noise(self, line: Line, white: Array, flicker: Array, random_walk: Array) -> Array:
        """Reference noise near multiples of the cycle's frequency that a cycle lets in, Hz^2/Hz: Σ |s_k|^2 S(k/cycle).

        Zero for a sensitivity that is even over the whole cycle.
        """
        return np.zeros((1, 1))

    def warnings(self, line: Line) -> tuple[tuple[str, str], ...]:
        """Doubts about the model at the nominal values, as (code, message)."""
        return ()
