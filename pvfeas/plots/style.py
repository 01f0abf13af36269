"""The look of the figures: fonts, colours, line styles, and texts measured before they are placed."""

from __future__ import annotations

import re
import unicodedata
from functools import cache
from typing import Any

# Okabe & Ito's palette for colour-blind readers (2008, Color Universal Design), without the yellow, which is too
# light for a line on paper. Lines are told apart by their dashes too, which is what a grey print leaves.
COLOURS = ("#0072B2", "#D55E00", "#009E73", "#CC79A7", "#E69F00", "#56B4E9", "#000000")
DASHES: tuple[Any, ...] = (
    "-",
    (0, (5, 1.5)),
    (0, (1.2, 1.2)),
    (0, (6, 1.5, 1.2, 1.5)),
    (0, (3, 1, 1, 1, 1, 1)),
    (0, (8, 4)),
    (0, (2.5, 2.5)),
)
FONT = "DejaVu Sans"  # comes with matplotlib: the same letters on every machine
SMALL, NORMAL, TITLE = 7.0, 8.0, 8.5  # points
LINE = 8.7  # points from line to line of small text
GREY, FAINT, DARK = "#8a8a8a", "#666666", "#222222"
SETTINGS: Any = {
    "font.family": FONT,
    "font.size": NORMAL,
    "axes.labelsize": NORMAL,
    "axes.titlesize": NORMAL,
    "xtick.labelsize": SMALL,
    "ytick.labelsize": SMALL,
    "axes.linewidth": 0.6,
    "axes.spines.top": False,
    "axes.spines.right": False,
    "lines.linewidth": 1.4,
    "pdf.fonttype": 42,
    "ps.fonttype": 42,
    "svg.fonttype": "path",
    "svg.hashsalt": "pvfeas",
    "text.parse_math": False,
    "text.usetex": False,
    "axes.formatter.use_mathtext": False,
    "path.simplify": False,
}


def colour(place: int) -> str:
    """The colour of the n-th line."""
    return COLOURS[place % len(COLOURS)]


def dashes(place: int) -> Any:
    """The dash pattern of the n-th line: no two of the first 49 have both colour and dashes in common."""
    return DASHES[(place + place // len(COLOURS)) % len(DASHES)]


@cache
def text_width(text: str, size: float, weight: str = "normal") -> float:
    """Width of a line of text in points, with a fiftieth more for what rendering rounds."""
    from matplotlib.font_manager import FontProperties
    from matplotlib.textpath import text_to_path

    told = FontProperties(family=FONT, size=size, weight=weight)
    return 1.02 * float(text_to_path.get_text_width_height_descent(text, told, ismath=False)[0])


@cache
def _letters() -> frozenset[int]:
    from matplotlib.font_manager import FontProperties, findfont, get_font

    return frozenset(get_font(findfont(FontProperties(family=FONT))).get_charmap())


def printable(text: str) -> str:
    """The text on one line, with signs that the font lacks in the nearest plain letters, else as a question mark."""
    found = ""
    for sign in " ".join(text.split()):
        if unicodedata.category(sign)[0] == "C":
            continue
        if ord(sign) in _letters():
            found += sign
        else:
            found += unicodedata.normalize("NFKD", sign).encode("ascii", "ignore").decode() or "?"
    return found


def lines_of(text: str, width: float, size: float, most: int, weight: str = "normal") -> list[str]:
    """The text on at most so many lines, none wider than width (points); what has no room ends in an ellipsis.

    Lines end at blanks and after underscores, hyphens and strokes; a longer word is cut.
    """
    lines = [""]
    for piece in re.findall(r"\s+|[^\s_/-]+[_/-]*|[_/-]+", text.strip()):
        if text_width((lines[-1] + piece).rstrip(), size, weight) <= width:
            lines[-1] += piece if lines[-1] or not piece.isspace() else ""
            continue
        if lines[-1]:
            lines.append("")
        for sign in piece.lstrip():
            if lines[-1] and text_width(lines[-1] + sign, size, weight) > width:
                lines.append("")
            lines[-1] += sign
    lines = [one.rstrip() for one in lines if one.strip()]
    if len(lines) <= most:
        return lines
    last = lines[most - 1]
    while last and text_width(f"{last} …", size, weight) > width:
        words = last.rpartition(" ")[0]  # a whole word goes where that leaves most of the line
        last = words if 2 * len(words) > len(last) else last[:-1].rstrip()
    return [*lines[: most - 1], f"{last} …"]


def name_lines(name: str, width: float, most: int) -> list[str]:
    """A name on at most so many lines; a longer one loses its middle, for names differ most at their ends."""
    name, cut = printable(name), 0
    shown = name
    while len(lines_of(shown, width, SMALL, most + 1)) > most:
        cut += 1
        keep = len(name) - cut
        shown = f"{name[: keep - keep // 2]}…{name[len(name) - keep // 2 :]}"
    return lines_of(shown, width, SMALL, most)
