"""Ticks of logarithmic axes: always at least two with a name, times in natural units, names that never touch."""

from __future__ import annotations

import math
from typing import Any

from pvfeas.plots.style import SMALL, text_width
from pvfeas.showing import PREFIXES, prefixed, time_text

SECOND, MINUTE, HOUR, DAY, WEEK, MONTH, YEAR = 1.0, 60.0, 3600.0, 86400.0, 604800.0, 2629800.0, 31557600.0
# Per unit: its size, and its multiples that come first, second, third and last where there is room for some only.
NATURAL: tuple[tuple[str, float, tuple[tuple[int, ...], ...]], ...] = (
    ("s", SECOND, ((1,), (10,), (30,), (2, 5, 20))),
    ("min", MINUTE, ((1,), (10,), (30,), (2, 5, 20))),
    ("h", HOUR, ((1,), (6,), (3, 12), (2,))),
    ("d", DAY, ((1,), (), (3,), (2,))),
    ("wk", WEEK, ((), (1,), (2,), (3,))),
    ("month", MONTH, ((), (1,), (3, 6), (2,))),
    ("yr", YEAR, ((1, 100), (10, 1000, 10000), (3, 30, 300), (2, 5, 20, 50, 200, 500))),
)
APART = (4.0, 5.0, 9.0, 9.0)  # points between names, by the same order
LEAST = 4.0  # points between ticks


def _time_candidates(low: float, high: float) -> list[tuple[int, float, str]]:
    """Order, place and name of every tick that may stand between two times, s."""
    found = [
        (order, many * size, f"{many} {unit}{'s' if unit == 'month' and many > 1 else ''}")
        for unit, size, orders in NATURAL
        for order, multiples in enumerate(orders)
        for many in multiples
    ]
    for power in range(math.floor(math.log10(low)) - 1, 0):  # below a second: decades, with 2 and 5 between
        for step, order in ((1, 0 if power % 3 == 0 else 1), (2, 3), (5, 3)):
            at = step * 10.0**power
            found.append((order, at, _plain(at, "s")))
    return sorted(one for one in found if low <= one[1] <= high)


def time_ticks(low: float, high: float, width: float) -> tuple[list[tuple[float, str]], list[float]]:
    """Ticks with names and ticks without, of a logarithmic axis of times. width: of the axis, points."""
    length = math.log(high / low)
    kept: list[tuple[float, str]] = []
    candidates = _time_candidates(low, high)
    for order, at, name in candidates:
        if all(
            abs(math.log(at / other)) / length * width
            >= (text_width(name, SMALL) + text_width(beside, SMALL)) / 2.0 + APART[order]
            for other, beside in kept
        ):
            kept.append((at, name))
    if len(kept) < 2:  # less than any two natural times apart
        kept = [(low * (high / low) ** part, time_text(low * (high / low) ** part, 4)) for part in (0.2, 0.8)]
    marks = [at for at, _ in kept]
    between: list[float] = []
    for _, at, _ in candidates:
        if all(abs(math.log(at / other)) / length * width >= LEAST for other in (*marks, *between)):
            between.append(at)
    return sorted(kept), sorted(between)


def time_axis(axes: Any, low: float, high: float, width: float) -> None:
    """A logarithmic axis of wall times, s, with ticks at natural times. width: of the axis, points."""
    axes.set_xscale("log")
    axes.set_xlim(low, high)
    named, between = time_ticks(low, high, width)
    _fixed(axes.xaxis, named, between)
    axes.set_xlabel("wall time (units on ticks)")


def value_ticks(low: float, high: float, unit: str) -> tuple[list[tuple[float, str]], list[float], str]:
    """Ticks with names, ticks without, and the unit for the axis label (empty: it stands on the ticks)."""
    first, last = math.floor(math.log10(low)), math.ceil(math.log10(high))

    def inside(steps: range | tuple[int, ...]) -> list[float]:
        places = [float(f"{step}e{power}") for power in range(first, last + 1) for step in steps]
        return [at for at in places if low <= at <= high]

    decades = inside((1,))
    if len(decades) > 5:
        named = decades if len(decades) <= 10 else [at for at in decades if round(math.log10(at)) % 3 == 0]
        between = [at for at in decades if at not in named]
        return [(at, _plain(at, unit)) for at in named], between, ""
    named = decades if len(decades) > 2 else inside((1, 2, 5))
    named = named if len(named) > 1 else inside(range(1, 10))
    if len(named) < 2:  # a range within one step of the first digit
        named = [float(f"{low * (high / low) ** part:.3g}") for part in (0.2, 0.8)]
    power = 0 if unit == "1" else 3 * round((math.log10(low * high) / 2.0 - 1.0) / 3.0)
    power = min(max(power, min(PREFIXES)), max(PREFIXES))
    between = [at for at in inside(range(1, 10)) if at not in named]
    return [(at, f"{at / 10.0**power:.6g}") for at in named], between, f"{PREFIXES[power]}{unit}"


def value_axis(axes: Any, low: float, high: float, label: str, unit: str) -> None:
    """A logarithmic vertical axis of values in a unit, which is shown with the prefix that suits them."""
    axes.set_yscale("log")
    axes.set_ylim(low, high)
    named, between, shown = value_ticks(low, high, unit)
    _fixed(axes.yaxis, named, between)
    axes.set_ylabel(f"{label} ({shown or 'units on ticks'})")


def _plain(value: float, unit: str) -> str:
    """1 ms, 20 µs: a round value with its prefix."""
    number, shown = prefixed(value, "" if unit == "1" else unit).split(" ", 1)
    return f"{number.rstrip('0').rstrip('.') if '.' in number else number} {shown}".strip()


def _fixed(axis: Any, named: list[tuple[float, str]], between: list[float]) -> None:
    from matplotlib.ticker import FixedFormatter, FixedLocator, NullFormatter

    axis.set_major_locator(FixedLocator([at for at, _ in named]))
    axis.set_major_formatter(FixedFormatter([name for _, name in named]))
    axis.set_minor_locator(FixedLocator(between))
    axis.set_minor_formatter(NullFormatter())
