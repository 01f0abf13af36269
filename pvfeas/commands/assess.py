"""pvfeas assess: everything about each scenario."""

from __future__ import annotations

from typing import Any

import click

from pvfeas.commands.shared import (
    Ticker,
    code_of,
    draw_figures,
    emit,
    format_of,
    format_options,
    known,
    number_options,
    options_of,
    read_study,
    screen,
    study_options,
    targets_of,
)


@click.command("assess")
@study_options
@click.option("--scenario", "names", multiple=True, metavar="NAME", help="Only this scenario; may be repeated.")
@format_options
@number_options
def command(
    study: str, settings: tuple[str, ...], names: tuple[str, ...], form: str | None, output: str, **given: Any
) -> int:
    """Required time, chance, significance, resolution, reach and limit of each scenario."""
    from pvfeas.compiler import problem_of
    from pvfeas.output.csv import assessment_csv
    from pvfeas.output.json import assessment_content, to_json
    from pvfeas.output.table import assessment_text
    from pvfeas.questions.assess import assess

    kind, options = format_of(form, output), options_of(given)
    targets_of(study, output, given)
    read = read_study(study, settings)
    known(names, read)
    problem = problem_of(read)
    with Ticker(given["quiet"]) as ticker:
        result = assess(problem, options, names, ticker)
    texts = {
        "json": lambda: to_json(assessment_content(result)),
        "csv": lambda: assessment_csv(result),
        "text": lambda: assessment_text(result, *screen(output)),
    }
    draw_figures(problem, result, result.question, given)
    emit(texts[kind](), output, "json" if kind == "json" else "")
    return code_of([one.chance.value for one in result.scenarios], given["fail_under"])
