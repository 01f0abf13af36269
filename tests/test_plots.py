"""Figures as a referee sees them: nothing over anything else, every axis labelled, fonts embedded, data as computed."""

from __future__ import annotations

import io
import re
import zlib
from itertools import combinations
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from pvfeas.compiler import problem_of
from pvfeas.options import Options
from pvfeas.output.provenance import metadata
from pvfeas.plots.saving import figure_bytes
from pvfeas.plots.sheet import sheet
from pvfeas.plots.style import apart, broken
from pvfeas.questions.curves import curves
from pvfeas.results import Curves
from pvfeas.studyfile import load_study

STUDIES = Path(__file__).resolve().parent.parent / "data" / "studies"
GOAL = '[goal]\nkind = "detect"\nsignificance = 5\npower = 0.9\nwithin = "{within}"\n'
FIRST = """
[scenario.{name}]
splitting = {{ value = "{splitting}", of = "difference" }}
technique = {{ kind = "ramsey", free_time = "20 ms", contrast = 0.7, molecules = "{molecules}", idle_time = "10 ms" }}
samples = {{ mass = "1 g", consumption = "4 mg/h" }}
[scenario.{name}.systematics]
{systematics}
"""
FLOOR = 'floor = { size = "20 mHz ×/ 1.5", averages = "never" }'
CHILD = '[scenario.{}]\nbased_on = "{}"\ntechnique = {{ free_time = "{} ms" }}\n'
LONG = "the_first_apparatus_with_helium"


def _twelve() -> str:
    ways = ('averages = "never"', 'averages = "as 1/t", after = "1 d"')
    return "\n".join(f'part_{i} = {{ size = "{4 * i} mHz ×/ 1.5", {ways[i % 2]} }}' for i in range(1, 13))


def _study(name: str) -> str:
    first = {"name": "x", "splitting": "0.5 Hz ×/ 1.6", "molecules": "300 ×/ 1.4", "systematics": FLOOR}
    if name == "five":
        text = "".join(
            CHILD.format(f"way-{i}-{'of' * i}-doing_it", LONG, 20 + i) for i in range(4)
        )  # curves all but on top of each other
        title = f'title = "{"A title that goes on and on. " * 8}"\n'
        return title + GOAL.format(within="60 d") + FIRST.format(**first | {"name": LONG}) + text
    changed = {
        "never": {"splitting": "1 mHz ×/ 1.6"},
        "exact": {"splitting": "0.5 Hz", "molecules": "300"},
        "twelve": {"systematics": _twelve()},
        "no floor": {"systematics": ""},
        "small": {"splitting": "3 µHz ×/ 2", "systematics": ""},
    }[name]
    return GOAL.format(within="2 h" if name == "exact" else "30 d") + FIRST.format(**first | changed)


CASES = ["five", "never", "exact", "twelve", "no floor", "small", *(one.stem for one in sorted(STUDIES.glob("*.toml")))]


@pytest.fixture(scope="module", params=CASES)
def drawn(request: Any) -> tuple[Curves, Any]:
    path = STUDIES / f"{request.param}.toml"
    problem = problem_of(load_study(str(path) if path.exists() else _study(request.param)))
    found = curves(problem, (), Options(tolerance=10.0))
    return found, sheet(found)


def _texts(figure: Any) -> list[tuple[str, Any]]:
    """Every text that is seen, with its box on the page."""
    from matplotlib.backends.backend_agg import FigureCanvasAgg
    from matplotlib.text import Text

    renderer = FigureCanvasAgg(figure).get_renderer()
    figure.draw(renderer)
    shown = [text for text in figure.findobj(Text) if text.get_visible() and text.get_text().strip()]
    return [(text.get_text(), text.get_window_extent(renderer)) for text in shown]


def test_no_text_over_another_or_outside(drawn: tuple[Curves, Any]) -> None:
    _, figure = drawn
    texts, page = _texts(figure), figure.bbox
    for (one, box), (other, second) in combinations(texts, 2):
        overlap = min(box.x1, second.x1) - max(box.x0, second.x0), min(box.y1, second.y1) - max(box.y0, second.y0)
        # boxes hold the room of descenders and ascenders: a tenth of a line of common room touches nothing
        assert min(overlap) < 0.1 * min(box.height, second.height), f"{one!r} and {other!r} overlap"
    for text, box in texts:
        assert page.x0 <= box.x0, text
        assert box.x1 <= page.x1, text
        assert page.y0 <= box.y0, text
        assert box.y1 <= page.y1, text


def test_axes_are_labelled(drawn: tuple[Curves, Any]) -> None:
    _, figure = drawn
    left, right = figure.axes
    assert (left.get_ylabel(), right.get_ylabel()) == (
        "sigma of the splitting seen (Hz)",
        "chance of meeting the goal (%)",
    )
    for axes in (left, right):
        assert axes.get_xlabel() == "wall time"
        for axis, (low, high) in ((axes.xaxis, axes.get_xlim()), (axes.yaxis, axes.get_ylim())):
            ticks = [
                t for t, label in zip(axis.get_majorticklocs(), axis.get_ticklabels(), strict=True) if label.get_text()
            ]
            assert sum(low <= tick <= high for tick in ticks) >= 2
        assert all(re.search(r"(ms|s|min|h|d|wk|months?|yr)$", label.get_text()) for label in axes.get_xticklabels())
    assert all(label.get_text().endswith("Hz") for label in left.get_yticklabels())


def test_lines_are_the_curves(drawn: tuple[Curves, Any]) -> None:
    found, figure = drawn
    for axes, wanted in zip(
        figure.axes, ([one.total for one in found.sigma], [one.chance for one in found.chance]), strict=True
    ):
        lines = [np.asarray(line.get_ydata()) for line in axes.get_lines()]
        for values in wanted:
            assert any(line.shape == (len(values),) and np.array_equal(line, values) for line in lines)


def test_small_type_is_at_least_seven_points(drawn: tuple[Curves, Any]) -> None:
    from matplotlib.text import Text

    assert min(text.get_fontsize() for text in drawn[1].findobj(Text) if text.get_text().strip()) >= 7.0


def test_fonts_are_embedded_truetype() -> None:
    found = curves(problem_of(load_study(_study("never"))), (), Options(tolerance=10.0))
    data = figure_bytes(sheet(found), "x.pdf", metadata("x", {"name": "assess"}, "0"))
    streams = [zlib.decompress(one) for one in re.findall(rb"stream\r?\n(.*?)endstream", data, re.S) if one[:1] == b"x"]
    whole = data + b"".join(streams)
    assert b"/Type3" not in whole
    assert b"/Type 3" not in whole
    assert b"/CIDFontType2" in whole
    assert b"/FontFile2" in whole


def test_png_is_sharp_enough_for_print() -> None:
    from matplotlib.image import imread

    found = curves(problem_of(load_study(_study("never"))), (), Options(tolerance=10.0))
    image = imread(io.BytesIO(figure_bytes(sheet(found), "x.png", metadata("x", {"name": "assess"}, "0"))))
    assert image.shape[1] >= 7.0 * 200  # dots: two columns at 200 dots an inch


def test_labels_keep_apart_and_inside() -> None:
    places = apart([0.5, 0.5, 0.5, 0.99, 1.0, 0.0, -0.3], [0.05] * 7)
    ordered = np.sort(places)
    assert np.all(np.diff(ordered) > 0.0499)
    assert ordered[0] >= 0.0
    assert ordered[-1] <= 1.0


@pytest.mark.parametrize(
    ("name", "lines"),
    [("short", ["short"]), ("cold-and-very-dark", ["cold-and-very-", "dark"]), ("a" * 40, ["a" * 14, "a" * 13 + "…"])],
)
def test_names_break(name: str, lines: list[str]) -> None:
    assert broken(name).split("\n") == lines
