"""Chance of meeting the goal against wall time."""

from __future__ import annotations

from typing import Any

from pvfeas.output.words import exact_time
from pvfeas.plots.style import DARK, GREY, SMALL, Label, broken, colour, dashes, end_labels, time_axis
from pvfeas.results import ChanceCurve

NEVER = 5e-4  # a ceiling below it is none


def draw_chance(axes: Any, curves: tuple[ChanceCurve, ...], wall: tuple[float, float]) -> list[str]:
    """Curves with their ceilings, guides at 50 and 90 %, the budget. Returns what the marks mean."""
    time_axis(axes, wall[0], wall[1], "wall time")
    axes.set_ylim(0.0, 1.0)
    axes.set_yticks([0.0, 0.25, 0.5, 0.75, 0.9, 1.0])
    axes.set_yticklabels(["0", "25", "50", "75", "90", "100"])
    axes.set_ylabel("chance of meeting the goal (%)")
    for guide in (0.5, 0.9):
        axes.axhline(guide, color=GREY, linewidth=0.6, zorder=1)
    _budget(axes, curves[0].budget, wall)
    labels = []
    for place, one in enumerate(curves):
        axes.plot(one.wall_time, one.chance, color=colour(place), linestyle=dashes(place), zorder=4, clip_on=False)
        axes.plot(
            [one.budget], [one.at_budget], marker="o", markersize=4, color=colour(place), markeredgecolor="white",
            zorder=5, clip_on=False,
        )  # fmt: skip
        if one.ceiling - one.chance[-1] > 0.01 or len(curves) == 1:
            axes.plot(wall, [one.ceiling] * 2, color=colour(place), linewidth=0.7, linestyle=":", zorder=2)
        at = one.ceiling if len(curves) == 1 else one.chance[-1]
        labels.append(Label(at, _label(one, len(curves) == 1), colour(place)))
    end_labels(axes, labels)
    ceilings = [] if len(curves) == 1 else ["per cent at the right: ceiling for unlimited time"]
    return ["dot on the right: chance within the budget", *ceilings]


def _budget(axes: Any, budget: float, wall: tuple[float, float]) -> None:
    from math import log

    axes.axvline(budget, color=DARK, linewidth=0.8, linestyle=(0, (4, 2)), zorder=2)
    share = log(budget / wall[0]) / log(wall[1] / wall[0])
    side = "left" if share < 0.2 else "right" if share > 0.8 else "center"
    axes.annotate(
        f"budget {exact_time(budget)}", (budget, 1.0), xycoords=("data", "axes fraction"), xytext=(0, 3),
        textcoords="offset points", va="bottom", ha=side, fontsize=SMALL, color=DARK, annotation_clip=False,
    )  # fmt: skip


def _label(one: ChanceCurve, single: bool) -> str:
    if one.ceiling < NEVER:
        return "never" if single else f"{broken(one.scenario)}\nnever"
    ceiling = f"{100 * one.ceiling:.3g} %"
    return f"ceiling\n{ceiling}" if single else f"{broken(one.scenario)}\n{ceiling}"
