"""The parts that figures are made of: colours, measured texts, ticks, labels that keep apart."""

from __future__ import annotations

import math
from itertools import pairwise

import numpy as np
import pytest

from pvfeas.output.words import exact_time
from pvfeas.plots.labels import spread
from pvfeas.plots.style import COLOURS, DASHES, SMALL, colour, dashes, lines_of, name_lines, printable, text_width
from pvfeas.plots.ticks import time_ticks, value_ticks

# Okabe & Ito 2008, Color Universal Design: black, orange, sky blue, bluish green, yellow, blue, vermillion,
# reddish purple.
OKABE_ITO = {"#000000", "#E69F00", "#56B4E9", "#009E73", "#F0E442", "#0072B2", "#D55E00", "#CC79A7"}


def test_colours_are_okabe_and_itos_and_dark_enough() -> None:
    assert set(COLOURS) <= OKABE_ITO
    assert len(set(COLOURS)) == len(COLOURS)
    for one in COLOURS:
        parts = [int(one[i : i + 2], 16) / 255.0 for i in (1, 3, 5)]
        linear = [part / 12.92 if part <= 0.04045 else ((part + 0.055) / 1.055) ** 2.4 for part in parts]
        # IEC 61966-2-1; a contrast of 2 to white is seen as a line, the yellow has 1.3
        assert 1.05 / (0.05 + float(np.dot([0.2126, 0.7152, 0.0722], linear))) > 2.0


def test_lines_differ_by_dashes_too() -> None:
    assert len({str(one) for one in DASHES}) == len(DASHES)
    assert len({(colour(i), str(dashes(i))) for i in range(49)}) == 49
    assert all(str(dashes(i)) != str(dashes(i + 1)) for i in range(6))


@pytest.mark.parametrize("text", ["statistics", "sample used up 20.8 d", "WWW_MMM", "µ – × Ω"])
def test_widths_are_those_of_the_page(text: str) -> None:
    """Against the box of the text as drawn, at 300 dots an inch; a fiftieth is added on purpose."""
    from matplotlib.backends.backend_agg import FigureCanvasAgg
    from matplotlib.figure import Figure

    figure = Figure(dpi=300)
    drawn = figure.text(0.1, 0.5, text, fontsize=SMALL, family="DejaVu Sans")
    points = drawn.get_window_extent(FigureCanvasAgg(figure).get_renderer()).width * 72.0 / 300.0
    # hinting moves a letter by half a dot at most
    assert text_width(text, SMALL) / 1.02 == pytest.approx(points, abs=(len(text) + 1) * 0.5 * 72.0 / 300.0)
    assert text_width(text, SMALL) >= points - 0.25


@pytest.mark.parametrize(
    "text",
    [
        "short",
        "cold-and-very-dark_room",
        "a" * 90,
        "words and words and words and more words",
        "_ - / _",
        "x" * 12 + " y",
    ],
)
def test_lines_keep_to_their_width_and_lose_nothing(text: str) -> None:
    lines = lines_of(text, 58.0, SMALL, 99)
    assert all(text_width(line, SMALL) <= 58.0 for line in lines)
    assert "".join("".join(lines).split()) == "".join(text.split())
    few = lines_of(text, 58.0, SMALL, 2)
    assert len(few) <= 2
    assert all(text_width(line, SMALL) <= 58.0 for line in few)
    assert few == lines or few[-1].endswith("…")


def test_long_names_keep_both_ends() -> None:
    shown = ["".join(name_lines(f"the_apparatus_{'of_' * 30}{end}", 58.0, 3)) for end in ("today", "later")]
    assert shown[0].startswith("the_apparatus_")
    assert shown[0].endswith("today")
    assert shown[1].endswith("later")
    assert all("…" in one for one in shown)
    assert name_lines("beam", 58.0, 3) == ["beam"]


def test_only_letters_of_the_font() -> None:
    assert printable("σ of Молекула\n two\tlines\x1b\u200b") == "σ of Молекула two lines"
    assert printable("分 𝟓") == "? 5" or printable("分 𝟓") == "? 𝟓"  # later fonts may have the digit


def _check_room(places: list[float], below: list[float], above: list[float], low: float, high: float) -> None:
    order = np.argsort(places)
    for i, j in pairwise(order):
        assert places[j] - places[i] >= above[i] + below[j] - 1e-9
    assert places[order[0]] - below[order[0]] >= low - 1e-9
    assert places[order[-1]] + above[order[-1]] <= high + 1e-9


@pytest.mark.parametrize("seed", range(12))
def test_labels_move_as_little_as_they_can(seed: int) -> None:
    """Against scipy's general optimiser on the same constraints."""
    from scipy.optimize import minimize

    draw = np.random.default_rng(seed)
    count = int(draw.integers(2, 8))
    wanted = np.sort(draw.uniform(-20.0, 120.0, count))
    below, above = draw.uniform(2.0, 9.0, count), draw.uniform(2.0, 9.0, count)
    found = spread(wanted, below, above, 0.0, 130.0)
    _check_room(found, below, above, 0.0, 130.0)
    gaps = above[:-1] + below[1:]
    rules = [
        {"type": "ineq", "fun": lambda x: np.diff(x) - gaps},
        {"type": "ineq", "fun": lambda x: np.array([x[0] - below[0], 130.0 - above[-1] - x[-1]])},
    ]
    start = below[0] + np.concatenate(([0.0], np.cumsum(gaps)))
    best = minimize(
        lambda x: float(np.sum((x - wanted) ** 2)), start, constraints=rules, method="SLSQP",
        options={"ftol": 1e-12, "maxiter": 500},
    )  # fmt: skip
    np.testing.assert_allclose(found, best.x, atol=1e-4)  # SLSQP's own accuracy on sums of squares of 1e4


def test_labels_at_one_place_stand_in_their_order() -> None:
    found = spread([5.0, 5.0, 5.0], [1.0] * 3, [1.0] * 3, 0.0, 10.0)
    assert found == pytest.approx([7.0, 5.0, 3.0], abs=1e-12)  # the first on top, the middle unmoved
    assert spread([], [], [], 0.0, 1.0) == []


@pytest.mark.parametrize("low", np.logspace(-8, 9, 35))
@pytest.mark.parametrize("decades", [0.05, 0.7, 1.4, 3.0, 9.0, 14.0])
def test_time_ticks_are_two_or_more_and_never_touch(low: float, decades: float) -> None:
    high, width = low * 10.0**decades, 140.0
    named, between = time_ticks(low, high, width)
    assert len(named) >= 2
    edges = []
    for at, name in named:
        assert low <= at <= high
        middle, half = width * math.log(at / low) / math.log(high / low), text_width(name, SMALL) / 2.0
        edges.append((middle - half, middle + half))
    assert all(second[0] - first[1] >= 3.0 for first, second in pairwise(edges))
    assert not {at for at, _ in named} & set(between)


@pytest.mark.parametrize("low", [1e-12, 3.3e-7, 1.01, 4.4e-3, 9.9e5])
@pytest.mark.parametrize("decades", [0.05, 0.3, 0.61, 1.2, 2.9, 4.0, 6.5, 13.0])
def test_value_ticks_are_two_or_more(low: float, decades: float) -> None:
    named, between, unit = value_ticks(low, low * 10.0**decades, "Hz")
    assert 2 <= len(named) <= 13
    assert unit.endswith("Hz") or all(name.endswith("Hz") for _, name in named)
    assert len({name for _, name in named}) == len(named)
    assert all(low <= at <= low * 10.0**decades * (1 + 1e-12) for at, _ in named)
    assert not {at for at, _ in named} & set(between)
    assert all(len(name) <= 9 for _, name in named)


@pytest.mark.parametrize(
    ("seconds", "text"),
    [
        (3600.0, "1 h"),
        (5400.0, "90 min"),
        (86400.0 * 60, "60 d"),
        (31557600.0, "1 yr"),
        (0.05, "50 ms"),
        (45.5, "45.5 s"),
    ],
)
def test_budgets_read_as_they_were_written(seconds: float, text: str) -> None:
    assert exact_time(seconds) == text
