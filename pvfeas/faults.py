"""Collecting everything that is wrong with a study before saying anything."""

from __future__ import annotations

import re
from collections.abc import Mapping

from pvfeas.errors import Fault, StudyError

Path = tuple[str, ...]


LONG_WORD = re.compile(r"[^\s\"']{60,}")


def brief(text: str) -> str:
    """A message in which no word is longer than a line."""
    return LONG_WORD.sub(lambda match: f"{match[0][:40]}…", text)


class Faults:
    """Faults of one file; each is kept once."""

    def __init__(self, file: str, lines: Mapping[Path, int]) -> None:
        self.file = file
        self.lines = lines
        self.found: dict[tuple[str, str], Fault] = {}

    def line_of(self, path: Path) -> int:
        """The line of a path, or of the nearest thing around it."""
        for size in range(len(path), 0, -1):
            if path[:size] in self.lines:
                return self.lines[path[:size]]
        return 0

    def line_inside(self, address: str, key: str, otherwise: int) -> int:
        """The line of a key inside the table at an address; the table's own line where it has none."""
        names = tuple(part for part in key.replace("[", ".").replace("]", "").split(".") if part)
        parts = tuple(address.split("."))
        path = parts if parts[0] in ("shared", "goal") else ("scenario", *parts)
        for size in range(len(names), 0, -1):
            if (*path, *names[:size]) in self.lines:
                return self.lines[(*path, *names[:size])]
        return otherwise

    def at(self, path: Path, address: str, found: str, wanted: str) -> None:
        """A fault at a path of the file."""
        self.add(self.line_of(path), address, found, wanted)

    def add(self, line: int, address: str, found: str, wanted: str, file: str | None = None) -> None:
        """A fault at a line."""
        fault = Fault(self.file if file is None else file, line, address, brief(found), brief(wanted))
        self.found.setdefault((address, found), fault)

    def __bool__(self) -> bool:
        return bool(self.found)

    def stop_if_any(self) -> None:
        """Raise StudyError with everything found so far."""
        if self.found:
            raise StudyError(list(self.found.values()))
