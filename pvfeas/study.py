"""The study as read: typed, frozen, every leaf with the place where it was written."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from pydantic import BaseModel, ConfigDict, Field

from pvfeas.quantity import Quantity


class _Frozen(BaseModel):
    model_config = ConfigDict(frozen=True, arbitrary_types_allowed=True, extra="forbid")


class Written(_Frozen):
    """A quantity where it was written; inherited ones keep the address of their origin."""

    address: str
    line: int = 0
    file: str = ""
    quantity: Quantity
    unit: str  # canonical unit of its field, "*" in shared


class Table(_Frozen):
    """One table of a scenario: its quantities and its plain options."""

    quantities: Mapping[str, Written] = Field(default_factory=dict)
    options: Mapping[str, Any] = Field(default_factory=dict)
    kind: str = ""  # of a technique
    line: int = 0
    written: bool = False  # whether any key of it stands in the file


class Scenario(_Frozen):
    """One way to measure, with everything it inherits."""

    name: str
    line_number: int = 0
    based_on: str = ""
    splitting: Written
    splitting_of: str
    line: Table
    technique: Table
    switching: Table
    samples: Table
    schedule: Table
    systematics: Mapping[str, Table]
    reference: Mapping[str, Table] = Field(default_factory=dict)
    technique_b: Table | None = None  # where arm_b overrides anything
    samples_b: Table | None = None


class Correlated(_Frozen):
    """Two inputs whose normal scores are correlated."""

    between: tuple[str, str]
    rho: float
    line: int = 0  # of between
    place: int = 0  # in the list


class Study(_Frozen):
    """A whole study. Made by load_study, Study.from_toml or Study.from_dict; all raise StudyError."""

    title: str
    file: str = ""
    goal: Mapping[str, Any]
    shared: Mapping[str, Written]
    scenario: Mapping[str, Scenario]
    correlation: tuple[Correlated, ...] = ()
    warnings: tuple[tuple[str, str, str], ...] = ()

    @classmethod
    def from_toml(cls, text: str, settings: tuple[tuple[str, str], ...] = ()) -> Study:
        """Read a study from TOML text."""
        from pvfeas.studyfile import load_text

        return load_text(text, settings=settings)

    @classmethod
    def from_dict(cls, content: Mapping[str, Any], settings: tuple[tuple[str, str], ...] = ()) -> Study:
        """Read a study from nested dictionaries with the names of the study file."""
        from pvfeas.studyfile import load_content

        return load_content(content, settings=settings)
