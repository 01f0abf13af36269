"""Chance of meeting the goal against wall time."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Any

from pvfeas.output.words import exact_time, share
from pvfeas.plots.labels import WIDEST, Label, Panel, Tag, beneath, draw_dot
from pvfeas.plots.sigma import MOST_LABELS
from pvfeas.plots.style import DARK, GREY, colour, dashes, name_lines
from pvfeas.results import ChanceCurve

LOW, HIGH = -0.03, 1.03  # ends of the axis: a curve at 0 or 1 is not on the frame
APART = 0.01  # of the chance, above which a ceiling has a line of its own


def draw_chance(axes: Any, curves: Sequence[ChanceCurve], wall: tuple[float, float]) -> Panel:
    """Curves with their ceilings, guides at 50 and 90 %, the budget. The sheet sets the horizontal axis."""
    axes.set_xscale("log")
    axes.set_xlim(*wall)
    axes.set_ylim(LOW, HIGH)
    axes.set_yticks([0.0, 0.25, 0.5, 0.75, 0.9, 1.0])
    axes.set_yticklabels(["0", "25", "50", "75", "90", "100"])
    axes.set_ylabel("chance of meeting the goal (%)")
    for guide in (0.5, 0.9):
        axes.plot(wall, [guide] * 2, color=GREY, linewidth=0.6, zorder=1)
    taken: list[tuple[float, float]] = []
    panel, single, few = Panel(), len(curves) == 1, len(curves) <= MOST_LABELS
    for budget in dict.fromkeys(one.budget for one in curves):
        _budget(axes, budget, wall, panel, curves[0] if single else None)
    for place, one in enumerate(curves):
        look = {"color": colour(place), "linestyle": dashes(place), "linewidth": 1.5 if few else 1.2}
        axes.plot(one.wall_time, one.chance, zorder=4, **look)
        if few and wall[0] <= one.budget <= wall[1]:
            under = beneath((_across(wall, one.budget), _height(one.at_budget)), taken)
            draw_dot(axes, one.budget, one.at_budget, colour(place), 5.0 if single else 6.0, under)
        dotted = {"color": colour(place), "linewidth": 0.8, "linestyle": (0, (1, 2))}
        if single or (few and one.ceiling - one.chance[-1] > APART):
            axes.plot(wall, [one.ceiling] * 2, zorder=2, **dotted)
        if single:
            panel.labels.append(Label(_height(one.ceiling), ("ceiling", share(one.ceiling)), dotted))
        elif few:
            lines = (*name_lines(one.scenario, WIDEST, 3), "ceiling", share(one.ceiling))
            panel.labels.append(Label(_height(one.chance[-1]), lines, look))
    panel.said.append("over all uncertain inputs")
    if taken:
        panel.said.append("dot: within the budget")
    panel.said.append("ceiling: for unlimited time")
    return panel


def _across(wall: tuple[float, float], at: float) -> float:
    return math.log(at / wall[0]) / math.log(wall[1] / wall[0])


def _height(chance: float) -> float:
    return (chance - LOW) / (HIGH - LOW)


def _budget(axes: Any, budget: float, wall: tuple[float, float], panel: Panel, single: ChanceCurve | None) -> None:
    """A line at the budget and its tag; a budget off the axis has a tag with an arrow at that end."""
    text = f"budget {exact_time(budget)}" + (f": {share(single.at_budget)}" if single else "")
    if budget > wall[1]:
        panel.tags.append(Tag(1.0, f"{text} →", led=False))
    elif budget < wall[0]:
        panel.tags.append(Tag(0.0, f"← {text}", led=False))
    else:
        axes.plot([budget] * 2, [LOW, HIGH], color=DARK, linewidth=0.8, linestyle=(0, (4, 2)), zorder=2)
        panel.tags.append(Tag(_across(wall, budget), text))
