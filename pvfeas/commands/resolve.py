"""pvfeas resolve: the complete study."""

from __future__ import annotations

import click

from pvfeas.commands.shared import emit, output_option, read_study, study_options, targets_of


@click.command("resolve")
@study_options
@output_option
def command(study: str, settings: tuple[str, ...], output: str) -> int:
    """Print the complete study, nothing left to inherit; it reads back to the same answer."""
    from pvfeas.resolving import resolve

    targets_of(study, output, {})
    emit(resolve(read_study(study, settings)), output, "toml")
    return 0
