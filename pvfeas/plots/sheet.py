"""The sheet of assess and compare: sigma on the left, chance on the right."""

from __future__ import annotations

from typing import Any

from pvfeas.plots.chance import draw_chance
from pvfeas.plots.sigma import draw_sigma
from pvfeas.plots.style import DARK, SETTINGS, SMALL
from pvfeas.results import Curves

WIDTH, HEIGHT = 7.2, 3.5  # inches: two columns of a journal
LINE = 0.034  # of the height, a line of small text
LONGEST = {"title": 105, "note": 138}  # signs on a line


def sheet(curves: Curves) -> Any:
    """A figure with both panels, its title, and what the marks mean."""
    from matplotlib import rc_context
    from matplotlib.figure import Figure

    with rc_context(SETTINGS):
        figure = Figure(figsize=(WIDTH, HEIGHT))
        left, right = figure.subplots(1, 2)
        times = curves.chance[0].wall_time
        wall = (times[0], times[-1])
        meaning = draw_sigma(left, curves.sigma, wall) + draw_chance(right, curves.chance, wall)
        title = _lines(f"{curves.title}: {curves.goal}" if curves.title else curves.goal, LONGEST["title"])
        note = _lines("; ".join(meaning), LONGEST["note"])
        figure.text(0.015, 0.985, "\n".join(title), fontsize=8.5, ha="left", va="top", color=DARK)
        figure.text(0.015, 0.015, "\n".join(note), fontsize=SMALL, ha="left", va="bottom", color=DARK, linespacing=1.1)
        figure.subplots_adjust(
            left=0.115, right=0.86, top=0.915 - 0.04 * len(title), bottom=0.135 + LINE * len(note), wspace=0.68
        )
    return figure


def _lines(text: str, longest: int) -> list[str]:
    """The text on lines of at most so many signs, at most three of them."""
    from textwrap import wrap

    return wrap(text, longest, max_lines=3, placeholder=" …")
