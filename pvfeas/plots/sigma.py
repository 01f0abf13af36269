"""sigma of the splitting seen against wall time."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import replace
from typing import Any

from pvfeas.plots.labels import NESTED, WIDEST, Label, Panel, Tag, beneath, draw_dot
from pvfeas.plots.style import DARK, GREY, colour, dashes, name_lines
from pvfeas.plots.ticks import value_axis
from pvfeas.results import SigmaCurve
from pvfeas.showing import time_text, value_text

MOST_PARTS = 6
MOST_LABELS = 4  # scenarios with their names beside the curves; more have a key below
LEAST_PART = 0.02  # of the total, below which a part is not drawn
SAME = 0.005  # of the axis, within which two lines are one
FARTHEST = 1e-5  # of the total, below which what the goal needs is off the axis
ALIKE = 0.01  # relative, below which two levels are one line
NEEDED: dict[str, Any] = {"color": DARK, "linewidth": 0.7}
FLOOR: dict[str, Any] = {"color": GREY, "linewidth": 0.9, "linestyle": (0, (1, 2))}


def draw_sigma(axes: Any, curves: Sequence[SigmaCurve], wall: tuple[float, float]) -> Panel:
    """One scenario: total with band, parts, floor, needed sigma. Several: totals and what each needs.

    Sets the vertical axis; the sheet sets the horizontal one.
    """
    shown = [(place, one) for place, one in enumerate(curves) if one.unit == curves[0].unit]
    low, high = _range([one for _, one in shown])
    what = "sigma of the signal" if curves[0].unit == "1" else "sigma of the splitting seen"
    value_axis(axes, low, high, what, curves[0].unit)
    axes.set_xscale("log")
    axes.set_xlim(*wall)
    axes.grid(visible=True, which="major", linewidth=0.3, color="#dddddd")
    panel = Panel()
    if len(curves) == 1:
        _alone(axes, curves[0], wall, panel)
    else:
        _several(axes, shown, wall, panel)
    if len(shown) < len(curves):
        panel.said.append("scenarios whose signal is of another kind are on the right only")
    return panel


def _range(curves: Sequence[SigmaCurve]) -> tuple[float, float]:
    single = curves[0] if len(curves) == 1 else None
    shown = [value for one in curves for value in one.total]
    needs = [one.needed_nominal for one in curves] if len(curves) <= MOST_LABELS else [curves[0].needed_nominal]
    if single is not None:
        shown += [*single.total_q16, *single.total_q84]
        needs += [single.needed_q16, single.needed_q84]
        shown += [values[-1] for _, values in _parts(single) if values[-1] > single.total[-1] / 10.0]
    shown += [each for each in needs if each and each > max(one.total[-1] for one in curves) * FARTHEST]
    shown = [value for value in shown if 0.0 < value < math.inf]
    least = min(shown)
    least = min([least, *(one.floor for one in curves if one.floor and one.floor > least / 30.0)])
    return least / 1.6, max(shown) * 1.6


def _height(axes: Any, value: float) -> float | None:
    """Where a value stands, in shares of the axis; None below it."""
    low, high = axes.get_ylim()
    return None if value < low else math.log(value / low) / math.log(high / low)


def _across(wall: tuple[float, float], at: float) -> float:
    return math.log(at / wall[0]) / math.log(wall[1] / wall[0])


def _began(one: SigmaCurve, values: Sequence[float]) -> tuple[list[float], list[float]]:
    """The curve from the first whole pattern on; before it there is nothing to average."""
    pairs = [pair for pair in zip(one.wall_time, values, strict=True) if pair[0] >= one.first]
    return [at for at, _ in pairs], [value for _, value in pairs]


def _alone(axes: Any, one: SigmaCurve, wall: tuple[float, float], panel: Panel) -> None:
    """Total, band, parts, floor and what the goal needs, of one scenario."""
    look = {"color": colour(0), "linestyle": "-"}
    axes.fill_between(
        *_began(one, one.total_q16), _began(one, one.total_q84)[1], color=colour(0), alpha=0.18, linewidth=0
    )
    axes.plot(*_began(one, one.total), linewidth=1.8, zorder=4, **look)
    name = ["total"]
    parts = _parts(one)
    if len(parts) == 1:
        name += [f"all {line}" if row == 0 else line for row, line in enumerate(_part_lines(parts[0][0], WIDEST - 14))]
        parts = []
    for place, (part, values) in enumerate(parts, start=1):
        style = {"color": colour(place), "linestyle": dashes(place), "linewidth": 1.1}
        axes.plot(*_began(one, values), zorder=5, **style)
        panel.labels.append(Label(_height(axes, values[-1]), tuple(_part_lines(part, WIDEST)), style))
    _floor(axes, one, wall, panel, name)
    panel.labels.insert(0, Label(_height(axes, one.total[-1]), tuple(name), look | {"linewidth": 1.8}))
    _needed_alone(axes, one, wall, panel)
    _times_alone(axes, one, wall, panel)
    panel.said[:0] = ["every input at its median", "bands: 16–84 % of the draws"]
    _beginning(panel, [one], wall)


def _part_lines(name: str, width: float) -> list[str]:
    return name_lines(name.removeprefix("systematics."), width, 2)


def _floor(axes: Any, one: SigmaCurve, wall: tuple[float, float], panel: Panel, name: list[str]) -> None:
    """What is left for unlimited time: its line, and its value at the total's label where the total is there."""
    if one.floor is None:
        return
    word = "floor" if one.last is None else "least"
    height = _height(axes, one.floor)
    if height is None:
        panel.said.append(f"{word}, below: {value_text(one.floor, one.unit)}")
        return
    if one.last is not None:
        panel.said.append(f"least: sigma left when the sample is used up ({time_text(one.last)})")
    text = f"{word} {value_text(one.floor, one.unit)}"
    there = [place for place, each in enumerate(panel.labels) if abs((each.height or -1.0) - height) < SAME]
    if not there:
        axes.plot(wall, [one.floor] * 2, zorder=1.5, **FLOOR)
    if one.total[-1] < one.floor * (1.0 + ALIKE):
        name.append(text)
    elif there:  # a part that is the floor
        part = panel.labels[there[0]]
        panel.labels[there[0]] = replace(part, lines=(*part.lines, text))
    else:
        panel.labels.append(Label(height, (word, value_text(one.floor, one.unit)), FLOOR))


def _needed_alone(axes: Any, one: SigmaCurve, wall: tuple[float, float], panel: Panel) -> None:
    if one.needed_q16 and one.needed_q84:
        axes.fill_between(wall, [one.needed_q16] * 2, [one.needed_q84] * 2, color=GREY, alpha=0.22, lw=0, zorder=1)
    if not one.needed_nominal:
        panel.said.append("no sigma would do with every input at its median")
        return
    axes.plot(wall, [one.needed_nominal] * 2, zorder=2, **NEEDED)
    lines = ("needed", value_text(one.needed_nominal, one.unit), *(("never met",) if one.crossing is None else ()))
    height = _height(axes, one.needed_nominal)
    panel.labels.append(Label(height, (*lines, *(("off the axis",) if height is None else ())), NEEDED))


def _times_alone(axes: Any, one: SigmaCurve, wall: tuple[float, float], panel: Panel) -> None:
    """The crossing and the end of the sample: a mark on the curve, a thin line up to the tag above the panel."""
    for at, word, marker, size in (
        (one.crossing, "goal met", "o", 5.0),
        (one.last, "sample used up", "|", 8.0),
    ):
        if at is None:
            continue
        if not wall[0] <= at <= wall[1]:
            if at == one.crossing:
                panel.said.append(f"{word} {time_text(at)}, off the axis")
            continue
        height = _total_at(one, at)
        axes.plot([at] * 2, [height, axes.get_ylim()[1]], color=DARK, linewidth=0.4, zorder=2)
        _mark(axes, at, height, marker, colour(0), size)
        panel.tags.append(Tag(_across(wall, at), f"{word} {time_text(at)}"))


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


def _several(axes: Any, curves: Sequence[tuple[int, SigmaCurve]], wall: tuple[float, float], panel: Panel) -> None:
    """Totals of several scenarios with what each needs, and their crossings and ends of the sample."""
    few = len(curves) <= MOST_LABELS
    _needed_several(axes, curves, wall, panel, few)
    taken: list[tuple[float, float]] = []
    triangle = False
    for place, one in curves:
        look = {"color": colour(place), "linestyle": dashes(place), "linewidth": 1.5 if few else 1.2}
        axes.plot(*_began(one, one.total), zorder=4, **look)
        if few:
            met = "never met" if one.crossing is None else f"met {time_text(one.crossing)}"
            ended = () if one.last is None else (f"ends {time_text(one.last)}",)
            lines = (*name_lines(one.scenario, WIDEST, 3), met, *ended)
            panel.labels.append(Label(_height(axes, one.total[-1]), lines, look))
        if few and one.floor and one.floor < 0.93 * one.total[-1] and _height(axes, one.floor) is not None:
            triangle = True
            size = 6.0 * NESTED ** beneath((1.0, _height(axes, one.floor) or 0.0), taken)
            axes.plot([wall[1]], [one.floor], marker="<", ms=size, mew=0, color=colour(place), zorder=6, clip_on=False)
        for at, marker, size in ((one.last, "|", 14.0), (one.crossing, "o", 6.0)):
            if at is None or not wall[0] <= at <= wall[1]:
                continue
            under = beneath((_across(wall, at), _height(axes, _total_at(one, at)) or 0.0), taken)
            _mark(axes, at, _total_at(one, at), marker, colour(place), size if few else 0.9 * size, under if few else 1)
    panel.said.insert(0, "every input at its median")
    if any(one.crossing is not None for _, one in curves):
        panel.said.append("dot, met: goal met" if few else "dot: goal met")
    if any(one.last is not None for _, one in curves):
        panel.said.append("bar, ends: sample used up" if few else "bar: sample used up")
    if triangle:
        panel.said.append("triangle: floor")
    _beginning(panel, [one for _, one in curves], wall)


def _needed_several(
    axes: Any, curves: Sequence[tuple[int, SigmaCurve]], wall: tuple[float, float], panel: Panel, few: bool
) -> None:
    """One line where all need the same sigma; else one each, thin, and none where there are many."""
    needs = [one.needed_nominal for _, one in curves if one.needed_nominal]
    if len(needs) == len(curves) and max(needs) < min(needs) * (1.0 + ALIKE):
        axes.plot(wall, [needs[0]] * 2, zorder=2, **NEEDED)
        panel.labels.append(Label(_height(axes, needs[0]), ("needed", value_text(needs[0], curves[0][1].unit)), NEEDED))
        return
    if few:
        for place, one in curves:
            if one.needed_nominal:
                axes.plot(wall, [one.needed_nominal] * 2, color=colour(place), linewidth=0.6, zorder=2)
        panel.said.append("thin level lines: sigma that the goal needs")


def _total_at(one: SigmaCurve, at: float) -> float:
    """The total at a wall time, along a straight line of the logarithms."""
    times, values = one.wall_time, one.total
    after = next((i for i, time in enumerate(times) if time >= at), len(times) - 1)
    if after == 0 or times[after] == at:
        return values[after]
    share = min(math.log(at / times[after - 1]) / math.log(times[after] / times[after - 1]), 1.0)
    return values[after - 1] * math.exp(share * math.log(values[after] / values[after - 1]))


def _mark(axes: Any, at: float, height: float, marker: str, shade: str, size: float, under: int = 0) -> None:
    if marker == "o":
        draw_dot(axes, at, height, shade, size, under)
        return
    size *= NESTED**under
    axes.plot(
        [at], [height], marker=marker, markersize=size, color=shade, linestyle="none", zorder=6, markeredgewidth=1.2
    )


def _beginning(panel: Panel, curves: Sequence[SigmaCurve], wall: tuple[float, float]) -> None:
    begins = [time_text(one.first) for one in curves if one.first > wall[0]]
    if begins:
        panel.said.append(f"curves begin with the first whole pattern ({', '.join(dict.fromkeys(begins[:4]))})")
