"""sigma of the splitting seen against wall time."""

from __future__ import annotations

import math
from typing import Any

from pvfeas.plots.style import DARK, GREY, SMALL, apart, colour, dashes, frequency_axis, time_axis
from pvfeas.results import SigmaCurve
from pvfeas.showing import time_text, value_text

LEAST_PART = 0.02  # of the total, below which a part is not drawn
LABEL_STEP = 0.055  # of the axis, between labels


def draw_sigma(axes: Any, curves: tuple[SigmaCurve, ...], wall: tuple[float, float]) -> None:
    """One scenario: total with band, parts, floor, needed sigma, crossing. Several: totals and crossings."""
    low, high = _range(curves)
    frequency_axis(axes, low, high, "sigma of the splitting seen (Hz)")
    time_axis(axes, wall[0], wall[1], "wall time")
    axes.grid(visible=True, linewidth=0.3, color="#dddddd")
    labels: list[tuple[float, str, str]] = []
    for place, one in enumerate(curves):
        single = len(curves) == 1
        axes.plot(one.wall_time, one.total, color=colour(place), linestyle=dashes(place), zorder=4)
        labels.append((one.total[-1], "total" if single else one.scenario, colour(place)))
        if single:
            axes.fill_between(one.wall_time, one.total_q16, one.total_q84, color=colour(place), alpha=0.18, linewidth=0)
            labels += _parts(axes, one)
            _needed_band(axes, one, wall)
        elif one.needed_q50 is not None:
            axes.plot(
                [wall[0], wall[1]], [one.needed_q50] * 2, color=colour(place), linewidth=0.7, linestyle=":", zorder=2
            )
        _crossing(axes, one, place, (low, high))
        _ends(axes, one, wall)
    _labels(axes, labels, (low, high))
    if len(curves) > 1:
        axes.text(
            0.02, 0.02, "dotted: sigma the goal needs (median)", transform=axes.transAxes, fontsize=SMALL, color=DARK
        )


def _range(curves: tuple[SigmaCurve, ...]) -> tuple[float, float]:
    shown = [value for one in curves for value in (*one.total, one.needed_q16, one.needed_q84, one.needed_q50) if value]
    return min(shown) / 2.0, max(shown) * 2.0


def _parts(axes: Any, one: SigmaCurve) -> list[tuple[float, str, str]]:
    labels = []
    for place, (name, values) in enumerate(one.parts.items(), start=1):
        if max(v / t for v, t in zip(values, one.total, strict=True)) < LEAST_PART:
            continue
        axes.plot(one.wall_time, values, color=colour(place), linestyle=dashes(place), linewidth=1.0, zorder=3)
        if values[-1] > min(one.total) / 4.0:
            labels.append((values[-1], name.removeprefix("systematics."), colour(place)))
    return labels


def _needed_band(axes: Any, one: SigmaCurve, wall: tuple[float, float]) -> None:
    if one.needed_q16 is None or one.needed_q84 is None or one.needed_q50 is None:
        return
    axes.fill_between(wall, [one.needed_q16] * 2, [one.needed_q84] * 2, color=GREY, alpha=0.22, linewidth=0, zorder=1)
    axes.plot(wall, [one.needed_q50] * 2, color=GREY, linewidth=0.9, zorder=2)
    axes.annotate(
        "needed (median, 16–84 %)",
        (wall[0], one.needed_q50),
        xytext=(3, 2),
        textcoords="offset points",
        fontsize=SMALL,
        color=DARK,
    )


def _crossing(axes: Any, one: SigmaCurve, place: int, span: tuple[float, float]) -> None:
    if one.crossing is None or one.needed_nominal is None or not span[0] < one.needed_nominal < span[1]:
        return
    if not one.wall_time[0] <= one.crossing <= one.wall_time[-1]:
        return
    axes.plot(
        [one.crossing],
        [one.needed_nominal],
        marker="o",
        markersize=4.5,
        color=colour(place),
        markeredgecolor="white",
        zorder=6,
    )
    axes.annotate(
        time_text(one.crossing), (one.crossing, one.needed_nominal), xytext=(5, 5), textcoords="offset points",
        fontsize=SMALL, color=colour(place), zorder=7,
    )  # fmt: skip


def _ends(axes: Any, one: SigmaCurve, wall: tuple[float, float]) -> None:
    if one.last is not None and wall[0] < one.last < wall[1]:
        axes.axvline(one.last, color=GREY, linewidth=0.7, linestyle=(0, (2, 2)))
        axes.annotate(
            f"sample used up, {time_text(one.last)}", (one.last, 1.0), xycoords=("data", "axes fraction"),
            xytext=(-3, -3), textcoords="offset points", rotation=90, va="top", ha="right", fontsize=SMALL, color=DARK,
        )  # fmt: skip
    if one.floor is not None:
        axes.axhline(one.floor, color=GREY, linewidth=0.6, linestyle=(0, (1, 1.5)), zorder=1)
        axes.annotate(
            f"floor {value_text(one.floor, 'Hz')}", (wall[0], one.floor), xytext=(3, -8), textcoords="offset points",
            fontsize=SMALL, color=DARK,
        )  # fmt: skip


def _labels(axes: Any, labels: list[tuple[float, str, str]], span: tuple[float, float]) -> None:
    length = math.log(span[1] / span[0])
    heights = [min(max(math.log(max(value, span[0]) / span[0]) / length, 0.0), 1.0) for value, _, _ in labels]
    for height, (_, text, shade) in zip(apart(heights, LABEL_STEP), labels, strict=True):
        axes.annotate(
            text, (1.0, height), xycoords="axes fraction", xytext=(4, 0), textcoords="offset points", fontsize=SMALL,
            color=shade, va="center", annotation_clip=False,
        )  # fmt: skip
