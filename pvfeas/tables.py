"""The tables of a scenario beside the technique, as frozen dataclasses of arrays.

At the Problem stage their numbers are expressions; evaluated on draws they are arrays in
Hz, s, kg, m, K, Pa that broadcast over draws. None: not given.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from typing import Any, ClassVar

import numpy as np

from pvfeas.keys import choice, flag, fraction, integer, pairs, positive, quantity, text
from pvfeas.laws import Array
from pvfeas.line import Line
from pvfeas.patterns import default_live_fraction, faults_of


@dataclass(frozen=True)
class Switching:
    """How live time is shared between the two enantiomers."""

    mode: str = choice(
        "one enantiomer at a time, or both at once", "alternating", "simultaneous", default="alternating"
    )
    live_fraction: Array | None = fraction(
        "share of the live time on enantiomer a; equal dwells, or one half without a pattern, if absent",
        lower_open=True, upper_open=True, example="0.5",
    )  # fmt: skip
    pattern: str | None = text("order of the enantiomers, repeated, as in ABBA; other letters: time without signal")
    dwell: Array | None = positive("s", "live time between two places of the pattern", example="20 s")
    dead_time: Array = quantity("s", "time lost at each change of letter", lower=0.0, default="0 s")
    rejection: Array | None = quantity(
        "1",
        "factor by which the amplitude of the reference's noise is rejected (simultaneous)",
        lower=1.0,
        example="30",
    )
    detrend: bool = flag("whether a linear drift is fitted and removed")

    @classmethod
    def rules(cls, given: Mapping[str, Any]) -> Iterator[tuple[str, str, str]]:
        """A pattern has a dwell and alternates; rejection belongs to arms at the same time."""
        if given.get("mode") == "simultaneous":
            for key in ("pattern", "dwell", "dead_time", "detrend", "live_fraction"):
                if key in given and given[key] is not False:
                    yield key, f"{key} with both enantiomers at once", 'it belongs to mode = "alternating": drop it'
            return
        if "rejection" in given:
            yield "rejection", "rejection with alternating enantiomers", 'it belongs to mode = "simultaneous": drop it'
        if "pattern" in given:
            wrong = faults_of(given["pattern"]) if isinstance(given["pattern"], str) else ""
            if wrong:
                yield "pattern", f'the pattern "{given["pattern"][:30]}"', wrong
            if "dwell" not in given:
                yield "dwell", "is missing", 'a pattern needs it: write dwell = "20 s"'
            return
        for key in ("dwell", "dead_time", "detrend"):
            if key in given and given[key] is not False:
                yield key, f"{key} without a pattern", 'write pattern = "ABBA" too, or drop it'

    def on_a(self) -> Array:
        """Share of the live time on enantiomer a."""
        if self.live_fraction is not None:
            return self.live_fraction
        return np.asarray(0.5 if self.pattern is None else default_live_fraction(self.pattern))


@dataclass(frozen=True)
class Reference:
    """One kind of frequency noise of the probe, or its drift."""

    name: str = ""
    kind: str = choice(
        "colour of the noise, or drift", "white", "flicker", "random-walk", "drift", "table",
        required=True, example="white",
    )  # fmt: skip
    allan: Array | None = positive("Hz", "Allan deviation at the averaging time at", example="3 Hz")
    at: Array = positive("s", "averaging time that allan belongs to", default="1 s")
    h: Array | None = positive(
        "1", "one-sided coefficient of the power spectral density in Hz^2/Hz at 1 Hz", example="9"
    )
    rate: Array | None = quantity("Hz/s", "drift in frequency per time", example="0.1 Hz/s")
    table: tuple[tuple[float, float], ...] | None = pairs("averaging times and Allan deviations", "s", "Hz")
    of: str = choice("whose frequency it is", "laser", "molecule", default="laser")

    @classmethod
    def rules(cls, given: Mapping[str, Any]) -> Iterator[tuple[str, str, str]]:
        """A drift has a rate, a table its pairs, noise exactly one of allan and h."""
        kind = given.get("kind")
        if not isinstance(kind, str):
            return
        own = {"drift": ("rate",), "table": ("table",)}.get(kind, ("allan", "h"))
        for key in ("allan", "h", "rate", "table"):
            if key in given and key not in own:
                yield key, f"{key} for a reference of kind {kind!r}", f"{' or '.join(own)} says its size: drop it"
        if not any(key in given for key in own):
            example = {"drift": 'rate = "0.1 Hz/s"', "table": 'table = [["1 s", "3 Hz"], …]'}.get(
                kind, 'allan = "3 Hz"'
            )
            yield own[0], "is missing", f"a reference of kind {kind!r} needs it: write {example}"
        if {"allan", "h"} <= set(given) and own == ("allan", "h"):
            yield "h", "both allan and h", "give one of them"
        if "at" in given and "allan" not in given:
            yield "at", "at without allan", "it belongs to allan: drop it"


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


__all__ = ["Goal", "Line", "Reference", "Samples", "Schedule", "Switching", "Systematic"]
