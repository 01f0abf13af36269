"""Switching patterns: which enantiomer is in the apparatus when, and what that makes of frequency noise.

A pattern is a text such as ABBA, repeated without end; other letters are times without signal. Dead time is
lost at each change of letter, also from the last to the first; equal neighbours join without loss.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from pvfeas.laws import Array


@dataclass(frozen=True)
class Timing:
    """When the letters of one pattern begin and end, s from its start; arrays broadcast over draws, letters first.

    begin, end: shape (letters, …); period: of the whole pattern, dead times included; live: time on either
    enantiomer per pattern.
    """

    pattern: str
    begin: Array
    end: Array
    period: Array
    live: Array


def faults_of(pattern: str) -> str:
    """What is wrong with a pattern, empty where nothing is."""
    if not pattern.isalpha() or not pattern.isupper() or not pattern.isascii():
        return "capital letters A to Z are needed, as in ABBA"
    if len(pattern) > 64:
        return "at most 64 letters are taken"
    if "A" not in pattern or "B" not in pattern:
        return "both A and B are needed"
    return ""


def default_live_fraction(pattern: str) -> float:
    """Share of the live time on A where all dwells last equally long."""
    return pattern.count("A") / (pattern.count("A") + pattern.count("B"))


def timing(pattern: str, dwell: Array, dead_time: Array, live_fraction: Array) -> Timing:
    """Begin and end of every letter. dwell: mean over A and B, s; letters that are neither last one dwell too.

    live_fraction: share of the live time on A; A dwells last live_fraction × (letters A and B)/(letters A) × dwell.
    """
    counts = {"A": pattern.count("A"), "B": pattern.count("B")}
    both = counts["A"] + counts["B"]
    lengths = {"A": live_fraction * both / counts["A"] * dwell, "B": (1.0 - live_fraction) * both / counts["B"] * dwell}
    shape = np.broadcast_shapes(np.shape(dwell), np.shape(dead_time), np.shape(live_fraction))
    at = np.zeros(shape)
    begin, end = [], []
    for place, letter in enumerate(pattern):
        begin.append(at)
        at = at + np.broadcast_to(lengths.get(letter, dwell), shape)
        end.append(at)
        if pattern[(place + 1) % len(pattern)] != letter:
            at = at + dead_time
    return Timing(pattern, np.stack(begin), np.stack(end), at, np.asarray(both * np.asarray(dwell)))


def jumps(found: Timing) -> tuple[Array, Array]:
    """Where the weight g changes, as a share of the period, and by how much; both (2 × letters, …).

    (1/period) ∫ g dt is +1 over the parts on A and -1 over those on B; g is zero elsewhere.
    """
    length = found.end - found.begin
    on_a = sum(
        (length[i] for i, letter in enumerate(found.pattern) if letter == "A"), np.zeros(found.period.shape)
    )  # fmt: skip
    on_b = found.live - on_a
    places, sizes = [], []
    for i, letter in enumerate(found.pattern):
        if letter not in "AB":
            continue
        value = found.period / on_a if letter == "A" else -found.period / on_b
        places += [found.begin[i] / found.period, found.end[i] / found.period]
        sizes += [value, -value]
    return np.stack(places), np.stack(sizes)


def drift_bias(found: Timing) -> Array:
    """b in s: a linear drift of the reference (Hz/s) times b is what A minus B shows of it: mean time on A - on B."""
    middle, length = (found.begin + found.end) / 2.0, found.end - found.begin
    sums = []
    for wanted in "AB":
        picked = [i for i, letter in enumerate(found.pattern) if letter == wanted]
        sums.append(sum(middle[i] * length[i] for i in picked) / sum(length[i] for i in picked))
    return np.asarray(sums[0] - sums[1])
