"""sigma of the splitting seen against wall time."""

from __future__ import annotations

import math
from typing import Any

from pvfeas.plots.style import DARK, GREY, Label, broken, colour, dashes, end_labels, frequency_axis, time_axis
from pvfeas.results import SigmaCurve
from pvfeas.showing import time_text, value_text

MOST_PARTS = 6
LEAST_PART = 0.02  # of the total, below which a part is not drawn


def draw_sigma(axes: Any, curves: tuple[SigmaCurve, ...], wall: tuple[float, float]) -> list[str]:
    """One scenario: total with band, parts, floor, needed sigma. Several: totals and what each needs.

    Returns what the marks mean.
    """
    low, high = _range(curves)
    frequency_axis(axes, low, high, "sigma of the splitting seen (Hz)")
    time_axis(axes, wall[0], wall[1], "wall time")
    axes.grid(visible=True, linewidth=0.3, color="#dddddd")

    def height(value: float) -> float:
        return math.log(max(value, low) / low) / math.log(high / low)

    labels: list[Label] = []
    for place, one in enumerate(curves):
        axes.plot(one.wall_time, one.total, color=colour(place), linestyle=dashes(place), zorder=4)
        name = "total" if len(curves) == 1 else broken(one.scenario)
        met = "" if one.crossing is None else f"\n{time_text(one.crossing)}"
        labels.append(Label(height(one.total[-1]), f"{name}{met}", colour(place)))
        if len(curves) == 1:
            labels += [Label(height(at), text, shade) for at, text, shade in _details(axes, one, wall)]
        else:
            _several(axes, one, place, wall)
        _marks(axes, one, place, wall)
    end_labels(axes, labels)
    return _meaning(curves, wall)


def _range(curves: tuple[SigmaCurve, ...]) -> tuple[float, float]:
    shown = [value for one in curves for value in (*one.total, one.needed_q16, one.needed_q84, one.needed_q50) if value]
    return min(shown) / 2.0, max(shown) * 2.0


def _details(axes: Any, one: SigmaCurve, wall: tuple[float, float]) -> list[tuple[float, str, str]]:
    """Band, parts, floor and what the goal needs; their labels."""
    axes.fill_between(one.wall_time, one.total_q16, one.total_q84, color=colour(0), alpha=0.18, linewidth=0)
    labels = []
    for place, (name, values) in enumerate(_parts(one), start=1):
        axes.plot(one.wall_time, values, color=colour(place), linestyle=dashes(place), linewidth=1.0, zorder=3)
        if values[-1] > axes.get_ylim()[0]:
            labels.append((values[-1], broken(name.removeprefix("systematics.")), colour(place)))
    if one.floor is not None:
        axes.axhline(one.floor, color=GREY, linewidth=0.6, linestyle=(0, (1, 1.5)), zorder=1)
        labels.append((one.floor, f"floor\n{value_text(one.floor, 'Hz')}", GREY))
    if one.needed_q16 is not None and one.needed_q84 is not None and one.needed_q50 is not None:
        axes.fill_between(wall, [one.needed_q16] * 2, [one.needed_q84] * 2, color=GREY, alpha=0.22, lw=0, zorder=1)
        axes.plot(wall, [one.needed_q50] * 2, color=GREY, linewidth=0.9, zorder=2)
        labels.append((one.needed_q50, "needed", DARK))
    return labels


def _parts(one: SigmaCurve) -> list[tuple[str, tuple[float, ...]]]:
    """The parts that matter, the largest first; where they are many, the smaller ones together."""
    largest = {
        name: max(v / t for v, t in zip(values, one.total, strict=True) if t > 0) for name, values in one.parts.items()
    }
    names = [name for name in sorted(largest, key=lambda each: -largest[each]) if largest[name] >= LEAST_PART]
    if len(names) <= MOST_PARTS:
        return [(name, one.parts[name]) for name in names]
    rest = names[MOST_PARTS - 1 :]
    together = tuple(math.hypot(*values) for values in zip(*(one.parts[name] for name in rest), strict=True))
    return [*((name, one.parts[name]) for name in names[: MOST_PARTS - 1]), (f"{len(rest)} others", together)]


def _several(axes: Any, one: SigmaCurve, place: int, wall: tuple[float, float]) -> None:
    if one.needed_q50 is not None:
        axes.plot(wall, [one.needed_q50] * 2, color=colour(place), linewidth=0.7, linestyle=":", zorder=2)
    if one.floor is not None:
        axes.plot([wall[1]], [one.floor], marker="<", markersize=4, color=colour(place), zorder=6, clip_on=False)


def _marks(axes: Any, one: SigmaCurve, place: int, wall: tuple[float, float]) -> None:
    """The nominal crossing and the end of the sample, on the curve."""
    look = {"color": colour(place), "markeredgecolor": "white", "zorder": 6, "linestyle": "none"}
    if one.crossing is not None and one.needed_nominal is not None and wall[0] <= one.crossing <= wall[1]:
        axes.plot([one.crossing], [one.needed_nominal], marker="o", markersize=4.5, **look)
    if _sample_ends(one, wall):
        before = [value for at, value in zip(one.wall_time, one.total, strict=True) if at >= (one.last or 0.0)]
        axes.plot([one.last], [before[0]], marker="|", markersize=9, color=colour(place), zorder=6, linestyle="none")


def _sample_ends(one: SigmaCurve, wall: tuple[float, float]) -> bool:
    return one.last is not None and wall[0] < one.last < wall[1]


def _meaning(curves: tuple[SigmaCurve, ...], wall: tuple[float, float]) -> list[str]:
    said = []
    if any(one.crossing is not None and wall[0] <= one.crossing <= wall[1] for one in curves):
        said.append("dot, time: goal met with every input at its median")
    ends = [time_text(one.last) for one in curves if one.last is not None and _sample_ends(one, wall)]
    if ends:
        said.append(f"bar: sample used up ({', '.join(dict.fromkeys(ends))})")
    if len(curves) == 1:
        said.append("bands: 16–84 % of the draws")
    else:
        said.append("dotted: sigma that the goal needs (median)")
        if any(one.floor is not None for one in curves):
            said.append("triangle: floor")
    return said
