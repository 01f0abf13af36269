"""pvfeas resolve: the complete study."""

from __future__ import annotations

import click

from pvfeas.commands.shared import emit, output_option, read_study, study_options


@click.command("resolve")
@study_options
@output_option
def command(study: str, settings: tuple[str, ...], output: str) -> int:
    """Print the complete study, nothing left to inherit; it reads back to the same answer."""
    from pvfeas.resolving import resolve

    emit(resolve(read_study(study, settings)), output)
    return 0
