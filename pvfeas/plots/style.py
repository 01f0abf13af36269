"""The look of the figures: fonts, colours, line styles, axes that are always labelled."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any

# Okabe & Ito's palette for colour-blind readers (2008, Color Universal Design), told apart by line style too.
COLOURS = ("#0072B2", "#D55E00", "#009E73", "#CC79A7", "#E69F00", "#56B4E9", "#000000")
DASHES: tuple[Any, ...] = (
    "-",
    (0, (5, 1.5)),
    (0, (1.5, 1.2)),
    (0, (6, 1.5, 1.5, 1.5)),
    (0, (3, 1, 1, 1, 1, 1)),
    "-",
    "--",
)
SMALL, NORMAL = 7.0, 8.0
GREY, DARK = "#8a8a8a", "#333333"
SIGN = 0.034  # of the axis, the width of a sign of a tick's name
LABEL_STEP = 0.05  # of the axis, the height of a line of a label
SETTINGS: Any = {
    "font.family": "DejaVu Sans",
    "font.size": NORMAL,
    "axes.labelsize": NORMAL,
    "axes.titlesize": NORMAL,
    "xtick.labelsize": SMALL,
    "ytick.labelsize": SMALL,
    "axes.linewidth": 0.6,
    "axes.spines.top": False,
    "axes.spines.right": False,
    "lines.linewidth": 1.4,
    "pdf.fonttype": 42,
    "ps.fonttype": 42,
    "svg.fonttype": "path",
    "svg.hashsalt": "pvfeas",
}
TIMES = (
    (1e-3, "1 ms"), (1e-2, "10 ms"), (0.1, "0.1 s"), (1.0, "1 s"), (10.0, "10 s"), (60.0, "1 min"), (600.0, "10 min"),
    (3600.0, "1 h"), (21600.0, "6 h"), (86400.0, "1 d"), (604800.0, "1 wk"), (2629800.0, "1 month"),
    (15778800.0, "6 months"), (31557600.0, "1 yr"), (157788000.0, "5 yr"), (315576000.0, "10 yr"),
    (3155760000.0, "100 yr"),
)  # fmt: skip


def colour(place: int) -> str:
    """The colour of the n-th line."""
    return COLOURS[place % len(COLOURS)]


def dashes(place: int) -> Any:
    """The dash pattern of the n-th line."""
    return DASHES[place % len(DASHES)]


def time_axis(axes: Any, low: float, high: float, label: str) -> None:
    """A logarithmic wall-time axis with ticks at human times."""
    from matplotlib.ticker import FixedFormatter, FixedLocator, NullFormatter, NullLocator

    axes.set_xscale("log")
    axes.set_xlim(low, high)
    ticks = [(at, name) for at, name in TIMES if low <= at <= high]
    ticks = spaced(ticks, math.log(high / low))
    if len(ticks) < 2:
        ticks = [(low * (high / low) ** f, _plain_time(low * (high / low) ** f)) for f in (0.1, 0.5, 0.9)]
    axes.xaxis.set_major_locator(FixedLocator([at for at, _ in ticks]))
    axes.xaxis.set_major_formatter(FixedFormatter([name for _, name in ticks]))
    axes.xaxis.set_minor_locator(NullLocator())
    axes.xaxis.set_minor_formatter(NullFormatter())
    axes.set_xlabel(label)


def spaced(ticks: list[tuple[float, str]], length: float) -> list[tuple[float, str]]:
    """Ticks whose names do not touch. length: of the axis, in ln t."""
    kept: list[tuple[float, str]] = []
    for at, name in ticks:
        if not kept or math.log(at / kept[-1][0]) / length > SIGN * (len(name) + len(kept[-1][1]) + 2) / 2.0:
            kept.append((at, name))
    return kept


def _plain_time(seconds: float) -> str:
    for unit, size in (("yr", 31557600.0), ("d", 86400.0), ("h", 3600.0), ("min", 60.0)):
        if seconds >= size:
            return f"{seconds / size:.3g} {unit}"
    return f"{seconds:.3g} s"


def frequency_axis(axes: Any, low: float, high: float, label: str) -> None:
    """A logarithmic axis of frequencies in Hz, labelled at 1, 2, 5 (or decades) with prefixes."""
    from matplotlib.ticker import FixedFormatter, FixedLocator, NullFormatter, NullLocator

    axes.set_yscale("log")
    axes.set_ylim(low, high)
    decades = math.log10(high / low)
    steps = (1.0,) if decades > 4 else (1.0, 3.0) if decades > 2 else (1.0, 2.0, 5.0)
    first, last = math.floor(math.log10(low)) - 1, math.ceil(math.log10(high)) + 1
    ticks = [step * 10.0**power for power in range(first, last) for step in steps]
    ticks = [tick for tick in ticks if low <= tick <= high]
    if len(ticks) < 2:
        ticks = [low * (high / low) ** f for f in (0.1, 0.5, 0.9)]
    axes.yaxis.set_major_locator(FixedLocator(ticks))
    axes.yaxis.set_major_formatter(FixedFormatter([short_frequency(tick) for tick in ticks]))
    axes.yaxis.set_minor_locator(NullLocator())
    axes.yaxis.set_minor_formatter(NullFormatter())
    axes.set_ylabel(label)


def short_frequency(value: float) -> str:
    """A frequency with its prefix, as a tick label."""
    for power, prefix in ((9, "G"), (6, "M"), (3, "k"), (0, ""), (-3, "m"), (-6, "µ"), (-9, "n"), (-12, "p")):
        if value >= 0.9999 * 10.0**power:
            return f"{value / 10.0**power:.3g} {prefix}Hz"
    return f"{value:.2g} Hz"


def apart(places: list[float], least: list[float]) -> list[float]:
    """Heights of labels, in shares of the axis, moved as little as needed so that none touch and none leave it.

    least: the height of each label.
    """
    order = sorted(range(len(places)), key=lambda i: places[i])
    bottom = [max(least[i] / 2.0 - LABEL_STEP / 2.0, 0.0) for i in order]
    moved = [min(max(places[i], low), 1.0) for i, low in zip(order, bottom, strict=True)]
    for _ in range(400):
        worst = 0.0
        for i in range(len(moved) - 1):
            gap = (least[order[i]] + least[order[i + 1]]) / 2.0 - (moved[i + 1] - moved[i])
            if gap > 1e-9:
                moved[i], moved[i + 1], worst = moved[i] - gap / 2.0, moved[i + 1] + gap / 2.0, max(worst, gap)
        moved = [min(max(one, low), 1.0) for one, low in zip(moved, bottom, strict=True)]
        if worst < 1e-6:
            break
    return [moved[order.index(i)] for i in range(len(places))]


def broken(name: str, longest: int = 14) -> str:
    """A name on at most two lines, broken after an underscore, hyphen or blank where there is one."""
    if len(name) <= longest:
        return name
    ends = [i + 1 for i, sign in enumerate(name) if sign in "_- " and i < longest]
    at = ends[-1] if ends else longest
    rest = name[at:] if len(name) - at <= longest else f"{name[at : at + longest - 1]}…"
    return f"{name[:at].rstrip()}\n{rest}"


@dataclass(frozen=True)
class Label:
    """A text at the right end of a panel, at a height in shares of the axis."""

    height: float
    text: str
    shade: str


def end_labels(axes: Any, labels: list[Label]) -> None:
    """Texts at the right edge, none over another; a thin line leads from the height to a text that had to move."""
    steps = [LABEL_STEP * (1 + one.text.count("\n")) for one in labels]
    for one, height in zip(labels, apart([one.height for one in labels], steps), strict=True):
        start = min(max(one.height, 0.0), 1.0)
        axes.plot(
            [1.0, 1.02], [start, height], transform=axes.transAxes, color=one.shade, linewidth=0.5, clip_on=False,
        )  # fmt: skip
        axes.annotate(
            one.text, (1.02, height), xycoords="axes fraction", xytext=(2, 0), textcoords="offset points",
            fontsize=SMALL, color=one.shade, va="center", annotation_clip=False, linespacing=1.0,
        )  # fmt: skip
