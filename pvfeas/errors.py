"""What can go wrong, as one tree.

PvfeasError
├── UsageError        wrong use of a command or a function
├── QuantityError     one quantity that cannot be read (found, wanted)
└── StudyError        everything wrong with one study: a tuple of faults
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass


class PvfeasError(Exception):
    """Base of every error that pvfeas raises on purpose."""


class UsageError(PvfeasError, ValueError):
    """A command or function was used in a way that cannot work."""


class QuantityError(PvfeasError, ValueError):
    """A quantity that cannot be read: what was found, what would be right."""

    def __init__(self, found: str, wanted: str, key: str = "") -> None:
        self.found = found
        self.wanted = wanted
        self.key = key  # inside the quantity's table, dotted: "values.HF", "scale[0].from"
        super().__init__(f"{found}; {wanted}")


@dataclass(frozen=True, order=True)
class Fault:
    """One thing wrong in a study: where, what was found, what would be right."""

    file: str
    line: int
    address: str
    found: str
    wanted: str

    def __str__(self) -> str:
        place = f"{self.file}:{self.line}: " if self.line else (f"{self.file}: " if self.file else "")
        where = f"{self.address}: " if self.address else ""
        return f"{place}{where}{self.found}; {self.wanted}"


class StudyError(PvfeasError, ValueError):
    """All faults of one study, in the order of their lines."""

    def __init__(self, faults: Sequence[Fault]) -> None:
        self.faults = tuple(sorted(faults))
        super().__init__("\n".join(str(fault) for fault in self.faults))
