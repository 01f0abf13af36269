"""pvfeas convert: energy equivalents, full-precision differences."""

from __future__ import annotations

import click

from pvfeas.commands.shared import emit


@click.command("convert", context_settings={"ignore_unknown_options": True})
@click.argument("value")
@click.option(
    "--to", "units", multiple=True, metavar="UNIT", help="Unit wanted; may be repeated. All of them if left out."
)
@click.option("--minus", metavar="VALUE", help="Subtract this value first, at full precision.")
@click.option("--digits", default=12, show_default=True, type=click.IntRange(1, 50), help="Significant digits.")
def command(value: str, units: tuple[str, ...], minus: str | None, digits: int) -> int:
    """Convert a frequency or energy VALUE such as "6.2 aeV" into other units."""
    from pvfeas.energy import TARGETS, convert, difference

    for unit in units or TARGETS:
        found = convert(value, unit, digits) if minus is None else difference(value, minus, unit, digits)
        emit(f"{found}\n", "-")
    return 0
