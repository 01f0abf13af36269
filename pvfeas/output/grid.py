"""Tables whose columns line up and whose cells are never cut."""

from __future__ import annotations

import io
import re
from collections.abc import Sequence

GAP = 3  # blanks between columns
Cells = Sequence[str]


def grid(header: Cells, rows: Sequence[Cells], width: int, colour: bool = False) -> str:
    """A table; where it is wider than width, several below each other that repeat the first column.

    A cell too long for a table of two columns is folded, never cut.
    """
    header, rows = _folded(header, rows, width)
    return "\n\n".join(
        _table([header[i] for i in picked], [[row[i] for i in picked] for row in rows], colour)
        for picked in _columns(header, rows, width)
    )


def fits(header: Cells, rows: Sequence[Cells], width: int) -> bool:
    """Whether one table is enough."""
    return len(_columns(header, rows, width)) == 1 and _wide(header, rows) <= width


def _folded(header: Cells, rows: Sequence[Cells], width: int) -> tuple[Cells, Sequence[Cells]]:
    """The first column at most half of the width, the others what it leaves to one of them."""
    first = max(map(_long, (row[0] for row in (header, *rows))))
    own = min(first, width // 2)
    rest = max(width - own - GAP, 1)

    def cells(row: Cells) -> list[str]:
        return [fold(cell, rest) if place else fold(cell, own, 2) for place, cell in enumerate(row)]

    return cells(header), [cells(row) for row in rows]


def fold(text: str, size: int, hanging: int = 0) -> str:
    """A text in lines of at most size columns, broken after a blank or a sign where there is one."""
    if _long(text) <= size:
        return text
    margin = " " * min(len(text) - len(text.lstrip()) + hanging, size // 2)  # of the lines below the first
    lines, here = [], ""
    for piece in re.findall(r"\s*[^\s_.:,-]*[_.:,-]*", text):
        while _long(here + piece) > size:
            if here.strip():
                lines.append(here.rstrip())
                here, piece = margin, piece.lstrip()
                continue
            end = next(end for end in range(len(piece), 0, -1) if end == 1 or _long(here + piece[:end]) <= size)
            lines.append(here + piece[:end])
            here, piece = margin, piece[end:]
        here += piece
    return "\n".join([*lines, here.rstrip()] if here.strip() else lines)


def _long(text: str) -> int:
    from rich.cells import cell_len

    return max(map(cell_len, text.split("\n")))


def _widths(header: Cells, rows: Sequence[Cells]) -> list[int]:
    return [max(_long(row[place]) for row in (header, *rows)) for place in range(len(header))]


def _wide(header: Cells, rows: Sequence[Cells]) -> int:
    return sum(_widths(header, rows)) + GAP * (len(header) - 1)


def _columns(header: Cells, rows: Sequence[Cells], width: int) -> list[list[int]]:
    """Which columns stand in which table: as many as fit, at least one beside the first."""
    widths = _widths(header, rows)
    found: list[list[int]] = []
    used = 0
    for place in range(1, len(header)):
        if not found or used + GAP + widths[place] > width:
            found.append([0])
            used = widths[0]
        found[-1].append(place)
        used += GAP + widths[place]
    return found or [[0]]


def _table(header: Cells, rows: Sequence[Cells], colour: bool) -> str:
    from rich import box
    from rich.console import Console
    from rich.table import Table
    from rich.text import Text

    table = Table(box=box.SIMPLE_HEAD, pad_edge=False, show_edge=False, header_style="bold" if colour else "")
    for name in header:
        table.add_column(Text(name), no_wrap=True)
    for row in rows:
        table.add_row(*(Text(cell) for cell in row))
    stream = io.StringIO()
    console = Console(
        file=stream, width=10_000, force_terminal=colour, no_color=not colour, highlight=False, legacy_windows=False
    )
    console.print(table)
    return "\n".join(line.rstrip() for line in stream.getvalue().splitlines())
