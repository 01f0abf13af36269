"""What several commands do alike: options, reading the study, writing the answer, progress."""

from __future__ import annotations

import os
import shutil
import sys
import time
from collections.abc import Callable, Mapping, Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any, TypeVar

import click

from pvfeas.errors import UsageError

if TYPE_CHECKING:
    from pvfeas.options import Options
    from pvfeas.problem import Problem
    from pvfeas.results import Assessment
    from pvfeas.study import Study

F = TypeVar("F", bound=Callable[..., Any])


def _together(*decorators: Callable[[F], F]) -> Callable[[F], F]:
    def decorate(function: F) -> F:
        for decorator in reversed(decorators):
            function = decorator(function)
        return function

    return decorate


study_options = _together(
    click.argument("study", metavar="STUDY"),
    click.option(
        "--set",
        "settings",
        multiple=True,
        metavar="ADDRESS=VALUE",
        help="Change an input, as in beam.line.fwhm='5 kHz'.",
    ),
)
output_option = click.option(
    "-o", "--output", default="-", metavar="FILE", help="Write there instead of standard output."
)
format_options = _together(
    click.option("--json", "form", flag_value="json", help="Write JSON."),
    click.option("--csv", "form", flag_value="csv", help="Write CSV."),
    click.option(
        "-o", "--output", default="-", metavar="FILE", help="Write there; .json, .csv or .txt sets the format."
    ),
)


class Span(click.FloatRange):
    """A range of numbers that NaN is not in."""

    def convert(self, value: Any, param: click.Parameter | None, ctx: click.Context | None) -> float:
        """The number; click's complaint where it is none or out of range."""
        number = float(super().convert(value, param, ctx))
        if number != number:
            self.fail(f"{value} is no number.", param, ctx)
        return number


number_options = _together(
    click.option("--seed", default=1, show_default=True, type=click.IntRange(0), help="Seed of the points."),
    click.option("--tolerance", default=1.0, show_default=True, type=Span(1e-3, 100), help="Scale of the tolerances."),
    click.option(
        "--method",
        type=click.Choice(["lattice", "monte-carlo"]),
        default="lattice",
        show_default=True,
        help="How inputs are drawn.",
    ),
    click.option(
        "--maximum-points",
        default=16384,
        show_default=True,
        type=click.IntRange(256, 2**20),
        help="Most points per replicate.",
    ),
    click.option("--figure", metavar="FILE", help="Draw sigma and chance against time: .pdf, .svg or .png."),
    click.option("--figure-data", metavar="FILE", help="The numbers of the figure as CSV."),
    click.option("--fail-under", type=Span(0, 1), metavar="CHANCE", help="Exit with 3 if a chance is lower."),
    click.option("--quiet", is_flag=True, help="No progress on stderr."),
)


def read_study(source: str, settings: tuple[str, ...]) -> Study:
    """The study with --set applied."""
    from pvfeas.studyfile import load_study

    pairs = []
    for one in settings:
        address, sign, value = one.partition("=")
        if not sign:
            raise UsageError(f"--set {one}: there is no =; write --set ADDRESS=VALUE")
        pairs.append((address.strip(), value))
    if not source:
        raise UsageError("STUDY is empty; name a file, or - for standard input")
    if source == "-" and sys.stdin is None:
        raise UsageError("standard input cannot be read: it is closed")
    if source != "-" and "\n" not in source and not Path(source).exists():
        raise UsageError(f"{source} does not exist")
    return load_study(source, pairs)


def known(names: Sequence[str], study: Study) -> None:
    """Refuse names of scenarios that the study does not have, with a suggestion."""
    from pvfeas.suggestions import did_you_mean

    for name in names:
        if name not in study.scenario:
            hint = did_you_mean(name, study.scenario) or f"the study has {', '.join(study.scenario)}"
            raise UsageError(f"no scenario is called {name!r}; {hint}")


def options_of(given: Mapping[str, Any]) -> Options:
    """The options that change numbers."""
    from pvfeas.options import Options

    return Options(given["seed"], given["tolerance"], given["method"], given["maximum_points"])


def targets_of(study: str, output: str, given: Mapping[str, Any]) -> None:
    """Refuse, before anything is computed, files that cannot be written one beside the other."""
    from pvfeas.output.writing import apart

    figure, data = given.get("figure"), given.get("figure_data")
    if figure:
        from pvfeas.plots.saving import figure_suffix

        figure_suffix(figure)
    named = (("--output", output), ("--figure", figure), ("--figure-data", data))
    apart([(option, target) for option, target in named if target is not None], study)


def format_of(form: str | None, output: str) -> str:
    """json, csv or text: as asked, or as the suffix says."""
    suffix = Path(output).suffix.lower() if output != "-" else ""
    known = {".json": "json", ".csv": "csv", ".txt": "text", "": "text"}
    if form is None and suffix not in known:
        raise UsageError(f"{output}: no format goes with {suffix}; use .json, .csv or .txt, or say --json or --csv")
    return form or known[suffix]


def emit(text: str, output: str, language: str = "") -> None:
    """Write text to the output, in ASCII where standard output can do no better.

    language: "json" or "toml" where the text is to be read back unchanged, with escapes of that language.
    """
    from pvfeas.output.words import encodable, escaped
    from pvfeas.output.writing import write_bytes

    encoding = (getattr(sys.stdout, "encoding", None) or "ascii") if output == "-" else "utf-8"
    shown = escaped(text, encoding, language) if language else encodable(text, encoding)
    write_bytes(output, shown.encode(encoding, "replace"))


def screen(output: str) -> tuple[int, bool]:
    """Width of a table and whether to use colour: those of a terminal, else 80 columns without colour."""
    terminal = output == "-" and sys.stdout is not None and sys.stdout.isatty()
    width = shutil.get_terminal_size((80, 24)).columns if terminal else 80
    return max(width, 40), terminal and not os.environ.get("NO_COLOR") and os.environ.get("TERM") != "dumb"


class Ticker:
    """Progress on stderr, on a terminal only and only when it lasts."""

    def __init__(self, quiet: bool) -> None:
        self.live = not quiet and sys.stderr is not None and sys.stderr.isatty()
        self.start = time.monotonic()
        self.shown = False

    def __enter__(self) -> Ticker:
        return self

    def __exit__(self, *_: object) -> None:
        self.done()

    def __call__(self, message: str) -> None:
        if self.live and time.monotonic() - self.start > 1.0:
            self.shown = True  # first, for an interruption may come in between
            sys.stderr.write(f"\r{message}, {time.monotonic() - self.start:.0f} s ")
            sys.stderr.flush()

    def done(self) -> None:
        """Clear the line."""
        if self.shown:
            sys.stderr.write("\r\x1b[K")
            sys.stderr.flush()


def draw_figures(
    problem: Problem, result: Assessment, question: Mapping[str, object], given: Mapping[str, Any]
) -> None:
    """The figure of an answer and its numbers, where they were asked for; both made before one is written."""
    if given["figure"] is None and given["figure_data"] is None:
        return
    from pvfeas.output.csv import curves_csv
    from pvfeas.output.provenance import metadata
    from pvfeas.output.writing import write_bytes
    from pvfeas.questions.curves import curves

    found = curves(problem, [one.name for one in result.scenarios], options_of(given))
    made: dict[str, bytes] = {}
    if given["figure"] is not None:
        from pvfeas.plots.saving import figure_bytes
        from pvfeas.plots.sheet import sheet

        said = metadata(result.title, question, result.sha256)
        made[given["figure"]] = figure_bytes(sheet(found), given["figure"], said)
    if given["figure_data"] is not None:
        made[given["figure_data"]] = curves_csv(found, question, result.sha256).encode()
    for target, data in made.items():
        write_bytes(target, data)


def code_of(chances: list[float], fail_under: float | None) -> int:
    """3 where a chance lies below what was asked."""
    return 3 if fail_under is not None and min(chances) < fail_under else 0
