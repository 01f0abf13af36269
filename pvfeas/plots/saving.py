"""A figure as bytes: embedded TrueType fonts, metadata, no dates, the same bytes each time."""

from __future__ import annotations

import io
from collections.abc import Mapping
from pathlib import Path
from typing import Any

from pvfeas.errors import UsageError
from pvfeas.plots.style import SETTINGS

FORMATS = (".pdf", ".svg", ".png")


def figure_suffix(target: str) -> str:
    """The format that the suffix of a target names. UsageError for one that is not known."""
    suffix = Path(target).suffix.lower()
    if suffix not in FORMATS:
        raise UsageError(f"{target}: figures are written as {', '.join(FORMATS)}")
    return suffix


def figure_bytes(figure: Any, target: str, metadata: Mapping[str, str]) -> bytes:
    """The figure in the format of the target's suffix. UsageError for another suffix."""
    suffix = figure_suffix(target)
    from matplotlib import rc_context

    told: dict[str, Any] = dict(metadata)
    if suffix == ".pdf":
        told |= {"CreationDate": None, "ModDate": None}
    elif suffix == ".svg":
        told = {
            "Title": metadata["Title"],
            "Description": metadata["Subject"],
            "Creator": metadata["Creator"],
            "Date": None,
        }
    else:
        told = {"Title": metadata["Title"], "Description": metadata["Subject"], "Software": metadata["Creator"]}
    stream = io.BytesIO()
    with rc_context(SETTINGS):
        figure.savefig(stream, format=suffix[1:], dpi=300, metadata=told)
    return stream.getvalue()
