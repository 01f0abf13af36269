"""pvfeas new: a starter study."""

from __future__ import annotations

import click

from pvfeas.commands.shared import emit, output_option
from pvfeas.errors import UsageError


@click.command("new")
@click.argument("technique")
@output_option
def command(technique: str, output: str) -> int:
    """Write a commented starter study for a TECHNIQUE: quoted, ramsey, scan, two-point or free-decay."""
    from pathlib import Path

    from pvfeas.starters import starter

    if not output:
        raise UsageError("--output: no file is named")
    if output != "-" and (Path(output).is_file() or Path(output).is_dir()):
        raise UsageError(f"{output} is there already; nothing was written")
    emit(starter(technique), output)
    return 0
