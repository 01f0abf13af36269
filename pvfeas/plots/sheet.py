"""The sheet of assess and compare: sigma on the left, chance on the right."""

from __future__ import annotations

from typing import Any

from pvfeas.plots.chance import draw_chance
from pvfeas.plots.sigma import draw_sigma
from pvfeas.plots.style import SETTINGS
from pvfeas.results import Curves

WIDTH, HEIGHT = 7.2, 3.3  # inches: two columns of a journal


def sheet(curves: Curves) -> Any:
    """A figure with both panels."""
    from matplotlib import rc_context
    from matplotlib.figure import Figure

    with rc_context(SETTINGS):
        figure = Figure(figsize=(WIDTH, HEIGHT))
        left, right = figure.subplots(1, 2)
        times = curves.chance[0].wall_time
        wall = (times[0], times[-1])
        draw_sigma(left, curves.sigma, wall)
        draw_chance(right, curves.chance, wall)
        figure.suptitle(
            f"{curves.title}: {curves.goal}" if curves.title else curves.goal, fontsize=8.5, x=0.02, ha="left"
        )
        figure.subplots_adjust(left=0.115, right=0.87, top=0.88, bottom=0.14, wspace=0.56)
    return figure
