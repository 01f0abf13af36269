"""Labels beside and above a panel: moved as little as needed so that none touch."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from typing import Any

from pvfeas.plots.style import DARK, FAINT, LINE, SMALL, text_width

LEADER, SAMPLE, GAP = 6.0, 13.0, 3.0  # points, beside a panel: leader, piece of the line, gap before the text
BESIDE = LEADER + SAMPLE + GAP
WIDEST = 58.0  # points, of a label beside a panel
TAG = 3.0  # points from a panel up to its tags
ROW = LINE + TAG  # points above a panel that its tags fill
NESTED = 0.64  # of the mark below, the size of a mark upon it
NEAR = (0.035, 0.025)  # shares of the axes within which two marks overlap


@dataclass(frozen=True)
class Label:
    """A text at the right end of a panel, with a piece of its line.

    height: where the line ends, in shares of the axis; None where it leaves the panel below.
    """

    height: float | None
    lines: tuple[str, ...]
    look: dict[str, Any]


@dataclass(frozen=True)
class Tag:
    """A text above a panel that names a wall time. at: in shares of the axis; led: from a line in the panel."""

    at: float
    text: str
    led: bool = True


@dataclass
class Panel:
    """What a panel asks of the sheet: labels at its right end, tags above it, what its marks mean."""

    labels: list[Label] = field(default_factory=list)
    tags: list[Tag] = field(default_factory=list)
    said: list[str] = field(default_factory=list)

    @property
    def beside(self) -> float:
        """Width of the labels, points."""
        return max((BESIDE + text_width(line, SMALL) for one in self.labels for line in one.lines), default=0.0)

    @property
    def tall(self) -> float:
        """Height of the labels one over another, points."""
        return LINE * sum(len(one.lines) for one in self.labels)


def spread(
    wanted: Sequence[float], below: Sequence[float], above: Sequence[float], low: float, high: float
) -> list[float]:
    """Places nearest to the wanted ones (least squares) at which no two touch and none leaves low … high.

    Isotonic regression by pooling adjacent violators, on the places less the room taken by those before them; its
    solution within bounds is the unbounded one, clipped (Barlow, Bartholomew, Bremner & Brunk 1972; from memory).
    below, above: what each takes on either side of its place. Where low … high is too short, they end above high.
    """
    order = sorted(range(len(wanted)), key=lambda i: (wanted[i], -i))
    taken, offsets = 0.0, []
    for i in order:
        offsets.append(taken + below[i])
        taken += below[i] + above[i]
    pools: list[tuple[float, int]] = []
    for i, offset in zip(order, offsets, strict=True):
        mean, count = wanted[i] - offset, 1
        while pools and pools[-1][0] > mean:
            other, many = pools.pop()
            mean, count = (mean * count + other * many) / (count + many), count + many
        pools.append((mean, count))
    free = [max(min(mean, high - taken), low) for mean, count in pools for _ in range(count)]
    found = [0.0] * len(order)
    for i, place, offset in zip(order, free, offsets, strict=True):
        found[i] = place + offset
    return found


def draw_labels(axes: Any, labels: Sequence[Label], width: float, height: float) -> None:
    """The labels at the right end of a panel of width by height points, with thin leaders to where they belong."""
    wanted = [height * (-1.0 if one.height is None else min(max(one.height, 0.0), 1.0)) for one in labels]
    places = spread(
        wanted, [LINE * (len(one.lines) - 0.5) for one in labels], [LINE / 2.0] * len(labels), -2.0, height + 2.0
    )
    for one, start, place in zip(labels, wanted, places, strict=True):
        if one.height is not None:
            _line(axes, (1.0, 1.0 + LEADER / width), (start / height, place / height), color=FAINT, linewidth=0.5)
        ends = (1.0 + LEADER / width, 1.0 + (LEADER + SAMPLE) / width)
        _line(axes, ends, (place / height,) * 2, **one.look)
        for row, line in enumerate(one.lines):
            axes.text(
                1.0 + BESIDE / width, (place - row * LINE) / height, line, transform=axes.transAxes, fontsize=SMALL,
                color=DARK, va="center_baseline", ha="left", clip_on=False,
            )  # fmt: skip


def draw_tags(axes: Any, tags: Sequence[Tag], width: float, height: float, beside: float) -> None:
    """The tags above a panel of width by height points, each over its wall time or led to it."""
    half = [text_width(one.text, SMALL) / 2.0 + 3.0 for one in tags]
    wanted = [one.at * width for one in tags]
    for one, start, place in zip(tags, wanted, spread(wanted, half, half, -20.0, width + beside), strict=True):
        if one.led:
            _line(axes, (start / width, place / width), (1.0, 1.0 + TAG / height), color=DARK, linewidth=0.4)
        axes.text(
            place / width, 1.0 + (TAG + 1.0) / height, one.text, transform=axes.transAxes, fontsize=SMALL, color=DARK,
            va="bottom", ha="center", clip_on=False,
        )  # fmt: skip


def draw_dot(axes: Any, at: float, height: float, shade: str, size: float, under: int) -> None:
    """A dot on a curve. under: how many dots it lies upon; it is so much smaller that each of them shows."""
    axes.plot(
        [at], [height], marker="o", markersize=size * NESTED**under, color=shade, linestyle="none", zorder=6,
        markeredgecolor="white", markeredgewidth=0.7 if under == 0 else 0.0,
    )  # fmt: skip


def beneath(spot: tuple[float, float], taken: list[tuple[float, float]]) -> int:
    """How many marks already stand where one is to go, in shares of the axes; it is put down as one of them."""
    taken.append(spot)
    return sum(abs(x - spot[0]) < NEAR[0] and abs(y - spot[1]) < NEAR[1] for x, y in taken[:-1])


def _line(axes: Any, across: tuple[float, float], up: tuple[float, float], **look: Any) -> None:
    from matplotlib.lines import Line2D

    axes.add_artist(Line2D(across, up, transform=axes.transAxes, clip_on=False, solid_capstyle="butt", **look))
