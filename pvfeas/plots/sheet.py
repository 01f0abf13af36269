"""The sheet of assess and compare: sigma on the left, chance on the right."""

from __future__ import annotations

from typing import Any

from pvfeas.plots.chance import draw_chance
from pvfeas.plots.key import draw_key, key_height
from pvfeas.plots.labels import ROW, Panel, draw_labels, draw_tags
from pvfeas.plots.sigma import MOST_LABELS, draw_sigma
from pvfeas.plots.style import DARK, LINE, NORMAL, SETTINGS, SMALL, TITLE, lines_of, printable, text_width
from pvfeas.plots.ticks import time_axis
from pvfeas.results import Curves

WIDTH = 518.4  # points, 7.2 inches: two columns of a journal
EDGE = 6.0  # points left free around everything
LEAST_HEIGHT = 166.0  # points, of a panel
TICKS, AXIS_LABEL = 8.0, 14.0  # points that ticks and a label take beside a panel
BELOW = 33.0  # points that ticks, their names and a label take below a panel
TITLE_LINE = 11.0  # points


def sheet(curves: Curves) -> Any:
    """A figure with both panels, its title, and what the marks mean."""
    from matplotlib import rc_context
    from matplotlib.figure import Figure

    with rc_context(SETTINGS):
        figure = Figure(figsize=(WIDTH / 72.0, LEAST_HEIGHT / 72.0))
        axes = figure.add_axes((0.1, 0.1, 0.3, 0.8)), figure.add_axes((0.5, 0.1, 0.3, 0.8))
        times = curves.chance[0].wall_time
        wall = (times[0], times[-1])
        panels = draw_sigma(axes[0], curves.sigma, wall), draw_chance(axes[1], curves.chance, wall)
        header = _header(curves)
        note = [line for one in _notes(*panels) for line in lines_of(one, WIDTH - 2 * EDGE, SMALL, 3)]
        key = key_height(curves) if len(curves.sigma) > MOST_LABELS else 0.0
        high = max(LEAST_HEIGHT, *(one.tall for one in panels))
        above = EDGE + TITLE_LINE * len(header) + 4.0 + ROW
        under = BELOW + key + LINE * len(note) + EDGE
        total = above + high + under
        figure.set_size_inches(WIDTH / 72.0, total / 72.0)
        lefts, wide = _places(axes, panels)
        for one, panel, left in zip(axes, panels, lefts, strict=True):
            one.set_position((left / WIDTH, under / total, wide / WIDTH, high / total))
            time_axis(one, *wall, wide)
            draw_labels(one, panel.labels, wide, high)
            draw_tags(one, panel.tags, wide, high, panel.beside)
        for row, (line, size, weight) in enumerate(header):
            _text(figure, total - EDGE - TITLE_LINE * row, line, size, total, "top", weight)
        for row, line in enumerate(reversed(note)):
            _text(figure, EDGE + LINE * row, line, SMALL, total, "bottom")
        if key:
            draw_key(figure, curves, EDGE, under - BELOW, (WIDTH, total))
    return figure


def _text(figure: Any, at: float, text: str, size: float, total: float, where: str, weight: str = "normal") -> None:
    figure.text(
        EDGE / WIDTH, at / total, text, fontsize=size, ha="left", va=where, color=DARK, fontweight=weight,
    )  # fmt: skip


def _header(curves: Curves) -> list[tuple[str, float, str]]:
    """Lines, sizes and weights: the title on at most two lines, then the goal, with the scenario if there is one."""
    room = WIDTH - 2 * EDGE
    title = lines_of(printable(curves.title), room, TITLE, 2, "bold")
    name = f"{printable(curves.sigma[0].scenario)}: " if len(curves.sigma) == 1 else ""
    goal = lines_of(f"{name}{printable(curves.goal)}", room, NORMAL, 2)
    return [*((line, TITLE, "bold") for line in title), *((line, NORMAL, "normal") for line in goal)]


def _notes(left: Panel, right: Panel) -> tuple[str, str]:
    return f"Left: {'; '.join(left.said)}.", f"Right: {'; '.join(right.said)}."


def _places(axes: tuple[Any, Any], panels: tuple[Panel, Panel]) -> tuple[tuple[float, float], float]:
    """Left ends and the common width of the panels, points: what labels and tick names leave."""
    before = [
        TICKS + AXIS_LABEL + max(text_width(name.get_text(), SMALL) for name in one.get_yticklabels()) for one in axes
    ]
    beside = [max(one.beside + 3.0, 8.0) for one in panels]
    wide = (WIDTH - 2 * EDGE - sum(before) - sum(beside) - 4.0) / 2.0
    first = EDGE + before[0]
    return (first, first + wide + beside[0] + 4.0 + before[1]), wide
