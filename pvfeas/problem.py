"""A study as numbers only: what the text half makes and the number half uses.

No text but names, no units, picklable. A number of a scenario is an Expression of the
study's inputs; a part of a scenario (technique, line, …) is a Template that becomes an
instance of its class when the inputs are drawn.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field
from typing import Any, Generic, TypeVar

import numpy as np

from pvfeas.laws import Array, Law
from pvfeas.tables import Goal, Line, Reference, Samples, Schedule, Switching, Systematic
from pvfeas.techniques.base import Technique

T = TypeVar("T")
Draws = Mapping[str, Array]


@dataclass(frozen=True)
class Ensemble:
    """Rival calculations of one quantity: one law each, enumerated, never sampled.

    Ensembles of the same group are tied by member name.
    """

    members: tuple[str, ...]
    laws: tuple[Law, ...]
    weights: tuple[float, ...]  # normalised
    group: str  # the input's own address where none was given


@dataclass(frozen=True)
class Input:
    """A quantity where it was written: one law or an ensemble, one draw per draw of the study."""

    address: str
    law: Law | Ensemble


@dataclass(frozen=True)
class Correlation:
    """Correlation rho of the normal scores of two inputs."""

    between: tuple[str, str]
    rho: float


@dataclass(frozen=True)
class Expression:
    """constant × Π inputs × Π base^exponent, kept inside limits where a product may leave its bounds."""

    constant: float = 1.0
    inputs: tuple[str, ...] = ()
    powers: tuple[tuple[Expression, Expression], ...] = ()
    limits: tuple[float, float] | None = None

    def at(self, draws: Draws) -> Array:
        """The value on the given draws."""
        value: Array = np.asarray(self.constant)
        for address in self.inputs:
            value = value * draws[address]
        for base, exponent in self.powers:
            value = value * base.at(draws) ** exponent.at(draws)
        return value if self.limits is None else np.clip(value, *self.limits)

    def addresses(self) -> Iterator[str]:
        """Every input that the value depends on, with repetitions."""
        yield from self.inputs
        for base, exponent in self.powers:
            yield from base.addresses()
            yield from exponent.addresses()

    def times(self, other: Expression) -> Expression:
        """The product with another expression."""
        return Expression(self.constant * other.constant, self.inputs + other.inputs, self.powers + other.powers)


@dataclass(frozen=True)
class Template(Generic[T]):
    """A part of a scenario before its inputs are drawn."""

    part: type[T]
    quantities: Mapping[str, Expression] = field(default_factory=dict)
    options: Mapping[str, Any] = field(default_factory=dict)

    def at(self, draws: Draws) -> T:
        """The part on the given draws."""
        numbers = {name: expression.at(draws) for name, expression in self.quantities.items()}
        return self.part(**numbers, **self.options)

    def addresses(self) -> Iterator[str]:
        """Every input that the part depends on, with repetitions."""
        for expression in self.quantities.values():
            yield from expression.addresses()


@dataclass(frozen=True)
class ScenarioProblem:
    """One way to measure, as numbers.

    splitting is the true signed difference nu(a) - nu(b) in Hz; arm b has templates of its
    own, equal to those of arm a where nothing was overridden.
    """

    name: str
    splitting: Expression
    line: Template[Line]
    technique_a: Template[Technique]
    technique_b: Template[Technique]
    switching: Template[Switching]
    samples_a: Template[Samples]
    samples_b: Template[Samples]
    schedule: Template[Schedule]
    systematics: tuple[Template[Systematic], ...]
    references: tuple[Template[Reference], ...]
    floor_declared: bool
    schedule_declared: bool

    def with_width(self, draws: Draws) -> Draws:
        """The draws, and the line's full width on them where it is composed, by its address."""
        width = self.line.at(draws).width
        return draws if width is None else {**draws, width_address(self.name): width}


def width_address(name: str) -> str:
    """Stands in expressions for the width of a scenario's line that no single input gives."""
    return f"{name}.line (full width)"


@dataclass(frozen=True)
class Problem:
    """A whole study as numbers: the goal, the distinct inputs sorted by address, the scenarios."""

    title: str
    sha256: str
    goal: Goal
    inputs: tuple[Input, ...]
    correlations: tuple[Correlation, ...]
    scenarios: tuple[ScenarioProblem, ...]
    warnings: tuple[tuple[str, str, str], ...] = ()  # code, address, message: found while reading
