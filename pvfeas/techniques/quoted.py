"""A sensitivity that somebody quotes: an uncertainty reached after some live time."""

from __future__ import annotations

from dataclasses import dataclass
from typing import ClassVar

import numpy as np

from pvfeas.keys import choice, positive
from pvfeas.laws import Array
from pvfeas.tables import Line
from pvfeas.techniques.base import Technique


@dataclass(frozen=True)
class Quoted(Technique):
    """An uncertainty that falls as one over the root of live time.

    sigma^2(t) = uncertainty^2 × after/t (white noise; common practice).
    """

    kind: ClassVar[str] = "quoted"
    summary: ClassVar[str] = "an uncertainty reached after some live time, as quoted by somebody"
    has_cycles: ClassVar[bool] = False

    uncertainty: Array = positive("Hz", "standard uncertainty reached", required=True, example="0.5 Hz ×/ 1.3")
    after: Array = positive("s", "live time after which it is reached", required=True, example="1 h")
    of: str = choice("what the uncertainty belongs to", "splitting", "one enantiomer", default="splitting")

    @property
    def states_splitting(self) -> bool:
        """Whether the uncertainty is already that of the splitting, both arms together."""
        return self.of == "splitting"

    def cycle_time(self, line: Line) -> Array:
        """The live time of the quotation, s."""
        return np.asarray(self.after)

    def centre_variance(self, line: Line) -> Array:
        """(uncertainty × excess noise)^2, Hz^2."""
        return np.asarray((self.uncertainty * self.excess_noise) ** 2)

    def interrogation_width(self, line: Line) -> Array | None:
        """The line's full width, if it was given."""
        return line.width
