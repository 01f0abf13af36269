"""Figures as a referee sees them: nothing over anything else, every axis labelled, fonts embedded, data as computed."""

from __future__ import annotations

import io
import math
import re
import subprocess
import sys
import warnings
import zlib
from dataclasses import replace
from itertools import combinations
from typing import Any

import numpy as np
import pytest
from figure_cases import CASES, FOREIGN, HARMLESS

from pvfeas.compiler import problem_of
from pvfeas.options import Options
from pvfeas.output.provenance import metadata
from pvfeas.output.words import share
from pvfeas.plots.saving import figure_bytes
from pvfeas.plots.sheet import sheet
from pvfeas.questions.curves import curves, goal_in_words
from pvfeas.results import Curves
from pvfeas.showing import time_text
from pvfeas.studyfile import load_study
from pvfeas.tables import Goal

TOLD = metadata("x", {"name": "assess"}, "0")
# The trade's units in seconds: Julian year, a twelfth of it.
SECONDS = {
    "µs": 1e-6, "ms": 1e-3, "s": 1.0, "min": 60.0, "h": 3600.0, "d": 86400.0, "wk": 7 * 86400.0,
    "month": 365.25 * 86400.0 / 12, "months": 365.25 * 86400.0 / 12, "yr": 365.25 * 86400.0,
}  # fmt: skip
HERTZ = {"µHz": 1e-6, "mHz": 1e-3, "Hz": 1.0, "kHz": 1e3, "MHz": 1e6, "nHz": 1e-9}
# A tenth of a line of common room touches nothing: boxes hold the room of descenders and ascenders.
SLACK = 0.1


def curves_of(text: str) -> Curves:
    return curves(problem_of(load_study(text)), (), Options(tolerance=20.0))


def copies(found: Curves, count: int) -> Curves:
    """As many scenarios with names and needs of their own, each a little slower than the one before."""
    sigma, chance = found.sigma[0], found.chance[0]

    def late(values: tuple[float, ...], place: int) -> tuple[float, ...]:
        return tuple(values[max(i - place, 0)] for i in range(len(values)))

    return replace(
        found,
        sigma=tuple(
            replace(sigma, scenario=f"option_{i}", total=late(sigma.total, i), needed_nominal=0.2 / (i + 1))
            for i in range(count)
        ),
        chance=tuple(replace(chance, scenario=f"option_{i}", chance=late(chance.chance, i)) for i in range(count)),
    )


@pytest.fixture(scope="module")
def narrow() -> Curves:
    return curves_of(CASES["narrow"])


@pytest.fixture(scope="module", params=[*CASES, "thirty scenarios", "no unit"])
def drawn(request: Any, narrow: Curves) -> tuple[Curves, Any]:
    if request.param == "thirty scenarios":
        found = copies(narrow, 30)
    elif request.param == "no unit":
        found = replace(narrow, sigma=(replace(narrow.sigma[0], unit="1"),))
    else:
        found = curves_of(CASES[request.param])
    with warnings.catch_warnings():
        warnings.simplefilter("error")  # matplotlib warns of letters that the font lacks, of values a log axis drops
        figure = sheet(found)
        figure_bytes(figure, "x.svg", TOLD)
    return found, figure


def texts(figure: Any) -> list[tuple[Any, Any]]:
    """Every text that is seen, with its box on the page."""
    from matplotlib.backends.backend_agg import FigureCanvasAgg
    from matplotlib.text import Text

    renderer = FigureCanvasAgg(figure).get_renderer()
    figure.draw(renderer)
    shown = [text for text in figure.findobj(Text) if text.get_visible() and text.get_text().strip()]
    return [(text, text.get_window_extent(renderer)) for text in shown]


def seconds(text: str) -> float:
    number, unit = text.split(" ")
    return float(number) * SECONDS[unit]


def lines(axes: Any) -> list[tuple[np.ndarray, np.ndarray]]:
    return [(np.asarray(line.get_xdata(), float), np.asarray(line.get_ydata(), float)) for line in axes.get_lines()]


def has_line(axes: Any, wall: Any, values: Any) -> bool:
    return any(
        x.shape == (len(wall),) and np.array_equal(x, wall) and np.array_equal(y, values) for x, y in lines(axes)
    )


def test_no_text_over_another_or_outside(drawn: tuple[Curves, Any]) -> None:
    placed, page = texts(drawn[1]), drawn[1].bbox
    for (one, box), (other, second) in combinations(placed, 2):
        overlap = min(box.x1, second.x1) - max(box.x0, second.x0), min(box.y1, second.y1) - max(box.y0, second.y0)
        assert min(overlap) < SLACK * min(box.height, second.height), f"{one.get_text()!r} and {other.get_text()!r}"
    for text, box in placed:
        assert page.x0 <= box.x0, text
        assert box.x1 <= page.x1, text
        assert page.y0 <= box.y0, text
        assert box.y1 <= page.y1, text


def test_no_line_through_a_text(drawn: tuple[Curves, Any]) -> None:
    """Curves, leaders, samples and rules, by matplotlib's own crossing of a path and a box."""
    from matplotlib.lines import Line2D
    from matplotlib.transforms import Bbox

    placed = texts(drawn[1])
    for line in drawn[1].findobj(Line2D):
        if not line.get_visible() or line.get_linestyle() == "None":
            continue
        path = line.get_transform().transform_path(line.get_path())
        for text, box in placed:
            room = SLACK * box.height if text.get_rotation() == 0 else SLACK * box.width
            inner = Bbox([[box.x0 + room, box.y0 + room], [box.x1 - room, box.y1 - room]])
            if line.get_clip_on() and line.axes is not None:
                inner = Bbox.intersection(inner, line.axes.bbox)
            if inner is not None and inner.width > 0 and inner.height > 0:
                assert not path.intersects_bbox(inner, filled=False), text.get_text()


def test_axes_have_units_and_ticks_with_names(drawn: tuple[Curves, Any]) -> None:
    found, figure = drawn
    left, right = figure.axes
    assert right.get_ylabel() == "chance of meeting the goal (%)"
    unit = re.fullmatch(r"sigma of the (splitting seen|signal) \((.+)\)", left.get_ylabel())
    assert unit
    for axes in (left, right):
        assert axes.get_xlabel() == "wall time (units on ticks)"
        for axis, (low, high) in ((axes.xaxis, axes.get_xlim()), (axes.yaxis, axes.get_ylim())):
            named = [
                (at, name.get_text())
                for at, name in zip(axis.get_majorticklocs(), axis.get_ticklabels(), strict=True)
                if name.get_text() and low <= at <= high
            ]
            assert len(named) >= 2
            if axis is axes.xaxis:
                for at, name in named:
                    assert seconds(name) == pytest.approx(at, rel=1e-12)  # natural ticks are exact
    for at, name in zip(left.get_yticks(), left.get_yticklabels(), strict=True):
        number, _, shown = name.get_text().partition(" ")
        size = 1.0 if found.sigma[0].unit == "1" else HERTZ[shown or unit[2]]
        assert float(number) * size == pytest.approx(at, rel=1e-12)


def test_lines_are_the_curves(drawn: tuple[Curves, Any]) -> None:
    """To the last bit; a curve of sigma begins with the first whole pattern."""
    found, (left, right) = drawn[0], drawn[1].axes
    for one in found.chance:
        assert has_line(right, one.wall_time, one.chance)
    for one in found.sigma:
        begun = np.asarray(one.wall_time) >= one.first
        wall = np.asarray(one.wall_time)[begun]
        assert has_line(left, wall, np.asarray(one.total)[begun])
        if len(found.sigma) > 1:
            assert not left.collections  # several scenarios: no bands
            continue
        biggest = {name: max(np.divide(part, one.total)) for name, part in one.parts.items()}
        shown = [name for name, most in biggest.items() if most >= 0.02]
        if 1 < len(shown) <= 6:
            assert all(has_line(left, wall, np.asarray(one.parts[name])[begun]) for name in shown)
        corners = left.collections[0].get_paths()[0].vertices[:, 1]
        for band in (one.total_q16, one.total_q84):
            assert np.isin(np.asarray(band)[begun], corners).all()


def test_parts_that_are_drawn_together_add_in_squares() -> None:
    found = curves_of(CASES["twelve systematics"])
    (one,), left = found.sigma, sheet(found).axes[0]
    wall = np.asarray(one.wall_time)
    drawn = [y for x, y in lines(left) if np.array_equal(x, wall) and not np.array_equal(y, one.total)]
    assert len(drawn) == 6
    everything = np.sqrt(np.sum([np.square(part) for part in one.parts.values()], axis=0))
    # parts under 2 % of the total each are left out: thirteen of them would be 13 × 4e-4 / 2 of sigma
    np.testing.assert_allclose(np.sqrt(np.sum(np.square(drawn), axis=0)), everything, rtol=3e-3)


def test_the_crossing_is_where_total_and_needed_meet(drawn: tuple[Curves, Any]) -> None:
    found, (left, _) = drawn[0], drawn[1].axes
    if len(found.sigma) > 4:
        return
    dots = [(x[0], y[0]) for x, y in lines(left) if len(x) == 1]
    for one in found.sigma:
        if one.crossing is None or not left.get_xlim()[0] <= one.crossing <= left.get_xlim()[1]:
            continue
        heights = [y for x, y in dots if x == one.crossing]
        assert heights
        assert one.needed_nominal is not None
        if one.crossing > 1.01 * one.first:
            # between two points of the curve sigma is taken as a power of time: 24 to a decade, curvature below 1/4
            assert heights[0] == pytest.approx(one.needed_nominal, rel=2e-3)


def test_tags_tell_the_times_and_the_chance(drawn: tuple[Curves, Any]) -> None:
    found, figure = drawn
    said = " ".join(text.get_text() for text, _ in texts(figure))
    for sigma, chance in zip(found.sigma, found.chance, strict=True):
        assert share(chance.ceiling) in said
        if sigma.crossing is not None:
            assert time_text(sigma.crossing) in said
        if sigma.last is not None:
            assert time_text(sigma.last) in said
        if len(found.sigma) == 1:
            assert share(chance.at_budget) in said


def test_type_is_at_least_seven_points_and_two_columns_wide(drawn: tuple[Curves, Any]) -> None:
    assert min(text.get_fontsize() for text, _ in texts(drawn[1])) >= 7.0
    assert drawn[1].get_size_inches()[0] == pytest.approx(7.2, abs=1e-9)  # set as 518.4 points


def test_more_than_four_scenarios_have_a_key(narrow: Curves) -> None:
    found = copies(narrow, 30)
    said = [text.get_text() for text, _ in texts(sheet(found))]
    assert all(said.count(one.scenario) == 1 for one in found.sigma)
    four = [text.get_text() for text, _ in texts(sheet(copies(narrow, 4)))]
    assert four.count("option_3") == 2  # beside its curve in both panels


def test_signals_of_another_kind_are_not_on_the_same_axis(narrow: Curves) -> None:
    found = copies(narrow, 2)
    mixed = replace(found, sigma=(found.sigma[0], replace(found.sigma[1], unit="1")))
    figure = sheet(mixed)
    assert not has_line(figure.axes[0], mixed.sigma[1].wall_time, mixed.sigma[1].total)
    assert has_line(figure.axes[1], mixed.chance[1].wall_time, mixed.chance[1].chance)
    assert any("of another kind" in text.get_text() for text, _ in texts(figure))


def test_titles_are_taken_to_the_letter(narrow: Curves) -> None:
    placed = texts(sheet(replace(narrow, title=HARMLESS)))
    assert HARMLESS in [text.get_text() for text, _ in placed]
    assert not any(text.get_parse_math() for text, _ in placed if "$" in text.get_text())
    foreign = [text.get_text() for text, _ in texts(sheet(replace(narrow, title=f"{FOREIGN}\n\x1b[31m")))]
    assert "Молекула Ω, ??, naïve ﬁgure, ? [31m" in foreign


@pytest.mark.parametrize("name", ["unreachable", "five scenarios, long names and title"])
def test_fonts_are_embedded_truetype(name: str) -> None:
    data = figure_bytes(sheet(curves_of(CASES[name])), "x.pdf", TOLD)
    streams = [zlib.decompress(one) for one in re.findall(rb"stream\r?\n(.*?)endstream", data, re.S) if one[:1] == b"x"]
    whole = data + b"".join(streams)
    assert b"/Type3" not in whole
    assert b"/Type 3" not in whole
    assert b"/CIDFontType2" in whole
    assert b"/FontFile2" in whole


def test_png_is_sharp_enough_for_print(narrow: Curves) -> None:
    from matplotlib.image import imread

    image = imread(io.BytesIO(figure_bytes(sheet(narrow), "x.png", TOLD)))
    assert image.shape[1] == 2160  # 7.2 inches at 300 dots an inch


WRITE = """
import hashlib, sys
sys.path.insert(0, sys.argv[1])
from figure_cases import CASES
from test_plots import TOLD, curves_of
from pvfeas.plots.saving import figure_bytes
from pvfeas.plots.sheet import sheet
for name in ("narrow", "floor not reached"):
    found = curves_of(CASES[name])
    for suffix in ("pdf", "svg", "png"):
        print(hashlib.sha256(figure_bytes(sheet(found), "x." + suffix, TOLD)).hexdigest())
assert "matplotlib.pyplot" not in sys.modules
"""


def test_same_bytes_twice() -> None:
    """In two processes with hashes of their own, for PDF, SVG and PNG; and no pyplot."""
    from os import environ
    from pathlib import Path

    folder = str(Path(__file__).parent)
    first, second = (
        subprocess.run(
            [sys.executable, "-c", WRITE, folder],
            capture_output=True, text=True, check=True, timeout=120, env={**environ, "PYTHONHASHSEED": seed},
        ).stdout
        for seed in ("1", "2")
    )  # fmt: skip
    assert first == second
    assert len(set(first.split())) == 6


def test_same_bytes_of_one_figure_twice(narrow: Curves) -> None:
    figure = sheet(narrow)
    for suffix in ("pdf", "svg", "png"):
        assert figure_bytes(figure, f"x.{suffix}", TOLD) == figure_bytes(figure, f"y.{suffix}", TOLD)


def test_a_limit_in_words_has_a_prefix() -> None:
    goal = Goal(kind="exclude", confidence=0.95, limit=3e-6, within=(86400.0,))
    assert goal_in_words(goal).startswith("exclude a splitting of 3.00 µHz")


def test_no_figure_of_an_empty_axis() -> None:
    """A budget and required times beyond the longest axis leave three decades of it or less, never nothing."""
    found = curves_of(CASES["everything off the axis"])
    wall = found.chance[0].wall_time
    assert len(wall) >= 60
    assert math.log10(wall[-1] / wall[0]) > 1.0
