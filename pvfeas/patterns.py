"""Switching patterns: which enantiomer is in the apparatus when, and what that makes of frequency noise.

A pattern is a text such as ABBA, repeated without end; other letters are times without signal. Dead time is
lost at each change of letter, also from the last to the first; equal neighbours join without loss.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache
from typing import Any

import numpy as np

from pvfeas.laws import Array


@dataclass(frozen=True)
class Timing:
    """When the letters of one pattern begin and end, s from its start; arrays broadcast over draws, letters first.

    begin, end: shape (letters, …); period: of the whole pattern, dead times included; live: time on either
    enantiomer per pattern. Made by timing(): equal letters last equally long, dead times are equal.
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


def levels(found: Timing) -> tuple[Array, Array]:
    """The weight g on A and on B: period/(time on A), -period/(time on B); then ∫ g dt/period is +1 and -1."""
    length = found.end - found.begin
    on_a = sum(
        (length[i] for i, letter in enumerate(found.pattern) if letter == "A"), np.zeros(found.period.shape)
    )  # fmt: skip
    return np.asarray(found.period / on_a), np.asarray(-found.period / (found.live - on_a))


def jumps(found: Timing) -> tuple[Array, Array]:
    """Where the weight g changes, as a share of the period, and by how much; both (2 × letters A and B, …).

    (1/period) ∫ g dt is +1 over the parts on A and -1 over those on B; g is zero elsewhere.
    """
    on_a, on_b = levels(found)
    places, sizes = [], []
    for i, letter in enumerate(found.pattern):
        if letter not in "AB":
            continue
        value = on_a if letter == "A" else on_b
        places += [found.begin[i] / found.period, found.end[i] / found.period]
        sizes += [value, -value]
    return np.stack(places), np.stack(sizes)


Pair = tuple[int, int, int]  # two jumps, and how often the product of their sizes counts


@lru_cache(maxsize=64)
def distances(pattern: str) -> tuple[tuple[Pair, ...], ...]:
    """The pairs of jumps of a pattern, grouped by their distance: Σ_{k>l} c_k c_l F(|x_k - x_l|) in few terms.

    In every group the distance is the same number of A, B, other letters and dead times, whatever these last: one
    pair, with a count, stands for all whose sizes have the same product up to sign. Joins without loss drop out,
    and so does the distance zero. Depends on the text only.
    """
    a, b, other_letter, dead = np.eye(4, dtype=int)
    at = np.zeros(4, dtype=int)
    places: list[tuple[np.ndarray[Any, Any], str, int]] = []
    for index, letter in enumerate(pattern):
        after = at + {"A": a, "B": b}.get(letter, other_letter)
        if letter in "AB":
            places += [(at, letter, 1), (after, letter, -1)]
        at = after + dead * int(pattern[(index + 1) % len(pattern)] != letter)
    groups: dict[tuple[int, ...], dict[str, list[int]]] = {}
    for k, (place, letter, sign) in enumerate(places):
        for other in range(k):
            difference = place - places[other][0]
            if not difference.any():
                continue
            both, product = min(letter + places[other][1], places[other][1] + letter), sign * places[other][2]
            kind = groups.setdefault(tuple(difference.tolist()), {}).setdefault(both, [k, other, product, 0])
            kind[3] += kind[2] * product
    kept = (tuple((k, other, count) for k, other, _, count in group.values() if count) for group in groups.values())
    return tuple(group for group in kept if group)


def drift_bias(found: Timing) -> Array:
    """b in s: a linear drift of the reference (Hz/s) times b is what A minus B shows of it: mean time on A - on B."""
    middle, length = (found.begin + found.end) / 2.0, found.end - found.begin
    sums = []
    for wanted in "AB":
        picked = [i for i, letter in enumerate(found.pattern) if letter == wanted]
        sums.append(sum(middle[i] * length[i] for i in picked) / sum(length[i] for i in picked))
    return np.asarray(sums[0] - sums[1])
