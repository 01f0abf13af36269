"""Chance of meeting the goal against wall time."""

from __future__ import annotations

from typing import Any

from pvfeas.plots.style import DARK, GREY, SMALL, apart, colour, dashes, time_axis
from pvfeas.results import ChanceCurve
from pvfeas.showing import time_text


def draw_chance(axes: Any, curves: tuple[ChanceCurve, ...], wall: tuple[float, float]) -> None:
    """Curves with their ceilings, guides at 50 and 90 %, the budget."""
    time_axis(axes, wall[0], wall[1], "wall time")
    axes.set_ylim(0.0, 1.0)
    axes.set_yticks([0.0, 0.25, 0.5, 0.75, 0.9, 1.0])
    axes.set_yticklabels(["0", "25", "50", "75", "90", "100"])
    axes.set_ylabel("chance of meeting the goal (%)")
    for guide in (0.5, 0.9):
        axes.axhline(guide, color=GREY, linewidth=0.6, zorder=1)
    budget = curves[0].budget
    axes.axvline(budget, color=DARK, linewidth=0.8, linestyle=(0, (4, 2)), zorder=2)
    left = budget > (wall[0] * wall[1]) ** 0.5
    axes.annotate(
        f"budget {time_text(budget)}", (budget, 0.0), xytext=(-3 if left else 3, 3), textcoords="offset points",
        rotation=90, va="bottom", ha="right" if left else "left", fontsize=SMALL, color=DARK,
    )  # fmt: skip
    ends = apart([one.chance[-1] for one in curves], 0.055)
    for place, one in enumerate(curves):
        axes.plot(one.wall_time, one.chance, color=colour(place), linestyle=dashes(place), zorder=4, clip_on=False)
        axes.plot(
            [budget],
            [one.at_budget],
            marker="o",
            markersize=4,
            color=colour(place),
            markeredgecolor="white",
            zorder=5,
            clip_on=False,
        )
        if one.ceiling - one.chance[-1] > 0.01 or len(curves) == 1:
            axes.plot(wall, [one.ceiling] * 2, color=colour(place), linewidth=0.7, linestyle=":", zorder=2)
        axes.annotate(
            _label(one, len(curves) == 1), (1.0, min(ends[place], 1.02)), xycoords="axes fraction", xytext=(4, 0),
            textcoords="offset points", fontsize=SMALL, color=colour(place), va="center", annotation_clip=False,
        )  # fmt: skip


def _label(one: ChanceCurve, single: bool) -> str:
    if one.ceiling < 5e-4:
        return f"{one.scenario}: never"
    ceiling = f"ceiling {100 * one.ceiling:.3g} %"
    return ceiling if single else f"{one.scenario}, {100 * one.ceiling:.3g} %"
