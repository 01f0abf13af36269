"""The tables of a scenario beside the technique, as frozen dataclasses of arrays.

At the Problem stage their numbers are expressions; evaluated on draws they are arrays in
Hz, s, kg, m, K, Pa that broadcast over draws. None: not given.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import ClassVar

from pvfeas.keys import choice, fraction, integer, positive, quantity, text
from pvfeas.laws import Array


@dataclass(frozen=True)
class Line:
    """The line that is measured; every width is a full width at half maximum."""

    frequency: Array | None = positive("Hz", "frequency of the line", example="29.1 THz")
    profile: str = choice("shape of the line", "lorentzian", "gaussian", default="lorentzian")
    fwhm: Array | None = positive("Hz", "full width at half maximum", example="12(2) kHz")


@dataclass(frozen=True)
class Switching:
    """How live time is shared between the two enantiomers."""

    mode: str = choice(
        "one enantiomer at a time, or both at once", "alternating", "simultaneous", default="alternating"
    )
    live_fraction: Array = fraction(
        "share of the live time on enantiomer a", lower_open=True, upper_open=True, default="0.5"
    )


@dataclass(frozen=True)
class Samples:
    """What is in the two sample cells, and how long it lasts."""

    ee_a: Array = quantity("1", "excess of the arm's own enantiomer in arm a", lower=-1.0, upper=1.0, default="1")
    ee_b: Array = quantity("1", "excess of the arm's own enantiomer in arm b", lower=-1.0, upper=1.0, default="1")
    ee_known_to: Array = quantity(
        "1", "standard uncertainty of (ee_a + ee_b)/2 that remains at the end", lower=0.0, upper=1.0, default="0"
    )
    mass: Array | None = positive("kg", "mass of each enantiomer at hand", example="2 g")
    consumption: Array | None = positive("kg/s", "mass used per live time of its arm", example="8 mg/h")


@dataclass(frozen=True)
class Schedule:
    """How much of the calendar is live time."""

    hours_per_day: Array = quantity("1", "hours of work per day", lower=0.0, upper=24.0, lower_open=True, default="24")
    days_per_week: Array = quantity("1", "days of work per week", lower=0.0, upper=7.0, lower_open=True, default="7")
    calibration_fraction: Array = fraction("share of the work spent on calibration", upper_open=True, default="0")
    uptime: Array = fraction("share of the scheduled time in which the apparatus runs", lower_open=True, default="1")


@dataclass(frozen=True)
class Systematic:
    """One named uncertainty that stands in the final budget of the splitting seen.

    size is in Hz, or a plain fraction where on names what it is a fraction of.
    """

    name: str = ""
    size: Array = quantity("Hz", "standard uncertainty that is left", lower=0.0, required=True, example="0.1 Hz ×/ 1.5")
    of: str = choice("what the size belongs to", "splitting", "one enantiomer", default="splitting")
    on: str = choice(
        "what the size is a fraction of; frequency shift in Hz if absent",
        "hertz", "width", "frequency", "scale", "signal", default="hertz",
    )  # fmt: skip
    averages: str = choice("how it averages", "never", "per reset", "as 1/t", "grows", required=True, example="never")
    every: Array | None = positive("s", "wall time between resets", example="1 d")
    after: Array | None = positive("s", "live time at which the size holds", example="1 d")
    group: str | None = text("entries of one group add linearly")
    dof: Array | None = quantity("1", "degrees of freedom behind the size", lower=1.0)


@dataclass(frozen=True)
class Goal:
    """What the campaign must show, and the rules of the claim."""

    kinds: ClassVar[tuple[str, ...]] = ("detect", "measure", "exclude", "sign")

    kind: str = choice("what is to be shown", *kinds, required=True, example="detect")
    significance: float | None = quantity(
        "1", "threshold of the claim in sigma", lower=0.0, lower_open=True, example="5"
    )
    power: float | None = fraction("chance that must be met", lower_open=True, upper_open=True, example="0.9")
    within: tuple[float, ...] = positive(
        "s", "wall time of the budget, or a list of them", required=True, many=True, example="60 d"
    )
    sides: int = integer("sides of the claim; 1 says that the sign is predicted", lower=1, upper=2, default=2)
    trials: int = integer("lines or splittings tried: the look-elsewhere effect", lower=1, default=1)
    looks: int = integer("equal instalments after each of which a claim may be made", lower=1, upper=1000, default=1)
    confidence: float = fraction("confidence level of a limit", lower_open=True, upper_open=True, default="0.95")
    limit: float | None = positive("Hz", "splitting to be excluded; the predicted one if absent", example="50 mHz")
    construction: str | None = choice(
        "how a limit is made from an outcome", "abs-plus-z", "feldman-cousins-abs", "flat-prior-abs",
        "feldman-cousins-bounded", "cls",
    )  # fmt: skip
    relative_uncertainty: float | None = positive("1", "goal of a measurement: sigma over splitting", example="0.2")
