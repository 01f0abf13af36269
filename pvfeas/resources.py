"""Finding the data folder: inside the installed package, or beside it in a checkout."""

from __future__ import annotations

from pathlib import Path


def data_folder() -> Path:
    """The folder with example studies and schemas."""
    package = Path(__file__).resolve().parent
    inside = package / "data"
    return inside if inside.is_dir() else package.parent / "data"
