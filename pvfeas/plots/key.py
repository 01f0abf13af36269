"""The key below the panels where scenarios are too many for names beside their curves."""

from __future__ import annotations

from typing import Any

from pvfeas.output.words import exact_time, share
from pvfeas.plots.style import DARK, GREY, SMALL, colour, dashes, name_lines, text_width
from pvfeas.results import Curves
from pvfeas.showing import time_text, value_text

ROW = 10.5  # points from line to line
SAMPLE = 26.0  # points: the piece of line before a name, and the gap after it
BETWEEN = 14.0  # points between columns
WIDEST = 190.0  # points, of a name


def key_height(curves: Curves) -> float:
    """Height of the key, points."""
    return ROW * (len(curves.sigma) + 1) + 6.0


def _columns(curves: Curves) -> list[list[str]]:
    budget = exact_time(curves.chance[0].budget)
    rows = [["scenario", "sigma needed", "goal met", "sample used up", f"chance within {budget}", "ceiling"]]
    for one, chance in zip(curves.sigma, curves.chance, strict=True):
        rows.append(
            [
                name_lines(one.scenario, WIDEST, 1)[0],
                value_text(one.needed_nominal, one.unit) if one.needed_nominal else "-",
                time_text(one.crossing),
                "-" if one.last is None else time_text(one.last),
                share(chance.at_budget),
                share(chance.ceiling),
            ]
        )
    return [list(column) for column in zip(*rows, strict=True)]


def draw_key(figure: Any, curves: Curves, left: float, top: float, size: tuple[float, float]) -> None:
    """A table with a piece of each line, from left and top on; size: of the figure; all in points."""
    from matplotlib.lines import Line2D

    columns = _columns(curves)
    start = left + SAMPLE
    for number, column in enumerate(columns):
        wide = max(text_width(cell, SMALL) for cell in column)
        for row, cell in enumerate(column):
            figure.text(
                (start if number == 0 else start + wide) / size[0], (top - ROW * (row + 0.5)) / size[1], cell,
                ha="left" if number == 0 else "right", va="center_baseline", fontsize=SMALL, color=DARK,
            )  # fmt: skip
        start += wide + BETWEEN
    rule = (top - ROW) / size[1]
    figure.add_artist(Line2D((left / size[0], (start - BETWEEN) / size[0]), (rule, rule), color=GREY, linewidth=0.4))
    for place in range(len(curves.sigma)):
        at = (top - ROW * (place + 1.5)) / size[1]
        ends = (left / size[0], (left + SAMPLE - 5.0) / size[0])
        figure.add_artist(
            Line2D(ends, (at, at), color=colour(place), linestyle=dashes(place), linewidth=1.2, solid_capstyle="butt")
        )
