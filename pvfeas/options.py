"""What a question may be asked with, beside the study."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

Method = Literal["lattice", "monte-carlo"]


@dataclass(frozen=True)
class Options:
    """Everything that changes the numbers of an answer and is not in the study.

    tolerance scales the default tolerances: 0.2 % at the median, 1 % at the 5 and 95 %
    quantiles, 0.001 in a probability. maximum_points counts points per replicate; there are
    16 replicates.
    """

    seed: int = 1
    tolerance: float = 1.0
    method: Method = "lattice"
    maximum_points: int = 16384
