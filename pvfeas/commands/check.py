"""pvfeas check: is the file right, what was understood."""

from __future__ import annotations

import click

from pvfeas.commands.shared import emit, output_option, read_study, screen, study_options, targets_of


@click.command("check")
@study_options
@output_option
def command(study: str, settings: tuple[str, ...], output: str) -> int:
    """Read a study and show what was understood; what is exact, assumed, without source."""
    from pvfeas.output.table import understood_text
    from pvfeas.understanding import understood

    targets_of(study, output, {})
    found = understood(read_study(study, settings))
    emit(understood_text(found, *screen(output)), output)
    return 0
