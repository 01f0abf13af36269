"""pvfeas compare: scenarios side by side."""

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


@click.command("compare")
@study_options
@click.argument("names", nargs=-1, metavar="[NAME]...")
@format_options
@number_options
def command(
    study: str, settings: tuple[str, ...], names: tuple[str, ...], form: str | None, output: str, **given: Any
) -> int:
    """Scenarios side by side: answers, what was written differently, and the odds that one beats another."""
    from pvfeas.compiler import problem_of
    from pvfeas.output.csv import assessment_csv
    from pvfeas.output.json import comparison_content, to_json
    from pvfeas.output.table import comparison_text
    from pvfeas.questions.compare import compare
    from pvfeas.questions.planning import chosen
    from pvfeas.understanding import differences

    kind, options = format_of(form, output), options_of(given)
    targets_of(study, output, given)
    read = read_study(study, settings)
    known(names, read)
    problem = problem_of(read)
    picked = [one.name for one in chosen(problem, names)]
    with Ticker(given["quiet"]) as ticker:
        result = compare(problem, names, options, differences(read, picked), ticker)
    texts = {
        "json": lambda: to_json(comparison_content(result)),
        "csv": lambda: assessment_csv(result.assessment),
        "text": lambda: comparison_text(result, *screen(output)),
    }
    draw_figures(problem, result.assessment, result.assessment.question, given)
    emit(texts[kind](), output, "json" if kind == "json" else "")
    return code_of([one.chance.value for one in result.assessment.scenarios], given["fail_under"])
