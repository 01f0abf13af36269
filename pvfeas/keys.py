"""How a key of the study file is declared: once, beside the numbers it becomes.

A part of a study (a technique, the line, the schedule, …) is a frozen dataclass of
arrays. Each of its attributes is declared with one of the functions below; checks,
messages, starter files, JSON Schema and documentation are made from that declaration.
"""

from __future__ import annotations

import dataclasses
from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any, Literal

Sort = Literal["quantity", "choice", "choices", "flag", "integer", "text", "pairs"]


@dataclass(frozen=True)
class Key:
    """What one key of the study file may hold.

    unit is the unit of the number inside the code ("Hz", "s", "1", "kg/s", "Hz/Pa", …) and so
    fixes the dimension; default is written as in a study file and None where there is none.
    """

    sort: Sort
    meaning: str
    unit: str = "1"
    lower: float = -float("inf")
    upper: float = float("inf")
    lower_open: bool = False  # the bound itself is not allowed
    upper_open: bool = False
    default: str | bool | int | tuple[str, ...] | None = None
    required: bool = False
    choices: tuple[str, ...] = ()
    along_line: bool = False  # may also be written in FWHM of the line
    many: bool = False  # a single value or a list of them
    example: str = ""  # what a starter file shows


def quantity(
    unit: str,
    meaning: str,
    *,
    lower: float = -float("inf"),
    upper: float = float("inf"),
    lower_open: bool = False,
    upper_open: bool = False,
    default: str | None = None,
    required: bool = False,
    along_line: bool = False,
    many: bool = False,
    example: str = "",
) -> Any:
    """Declare a number with a unit; None in the dataclass where it may be absent and is."""
    key = Key(
        "quantity", meaning, unit, lower, upper, lower_open, upper_open, default, required,
        along_line=along_line, many=many, example=example,
    )  # fmt: skip
    return field(default=None, metadata={"key": key})


def positive(unit: str, meaning: str, **more: Any) -> Any:
    """Declare a quantity that must be above zero."""
    return quantity(unit, meaning, lower=0.0, lower_open=True, **more)


def fraction(meaning: str, **more: Any) -> Any:
    """Declare a quantity between 0 and 1."""
    return quantity("1", meaning, **({"lower": 0.0, "upper": 1.0} | more))


def choice(meaning: str, *choices: str, default: str | None = None, required: bool = False, example: str = "") -> Any:
    """Declare a word out of a list."""
    key = Key("choice", meaning, choices=choices, default=default, required=required, example=example)
    return field(default=default, metadata={"key": key})


def choices(meaning: str, *allowed: str, default: tuple[str, ...]) -> Any:
    """Declare a set of words out of a list."""
    return field(default=default, metadata={"key": Key("choices", meaning, choices=allowed, default=default)})


def flag(meaning: str, default: bool = False) -> Any:
    """Declare a true or false."""
    return field(default=default, metadata={"key": Key("flag", meaning, default=default)})


def integer(
    meaning: str,
    *,
    lower: int,
    upper: int = 10**9,
    default: int | None = None,
    required: bool = False,
    example: str = "",
) -> Any:
    """Declare a whole number."""
    key = Key("integer", meaning, lower=lower, upper=upper, default=default, required=required, example=example)
    return field(default=default, metadata={"key": key})


def text(meaning: str, default: str | None = None, required: bool = False) -> Any:
    """Declare free text."""
    return field(default=default, metadata={"key": Key("text", meaning, default=default, required=required)})


def pairs(meaning: str, first: str, second: str) -> Any:
    """Declare a list of pairs of exact quantities in these units; numbers once they are read."""
    return field(default=None, metadata={"key": Key("pairs", meaning, unit=f"{first}, {second}")})


def keys_of(part: type) -> Mapping[str, Key]:
    """The declared keys of a part, in the order of its attributes."""
    return {f.name: f.metadata["key"] for f in dataclasses.fields(part) if "key" in f.metadata}
