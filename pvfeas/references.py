"""Addresses of a study: which quantity stands where, and what dimension it has."""

from __future__ import annotations

from collections.abc import Iterator

from pvfeas.errors import QuantityError
from pvfeas.laws import Law
from pvfeas.quantity import Quantity
from pvfeas.study import Study, Table, Written
from pvfeas.units import dimension_of

Dimension = tuple[tuple[str, float], ...]


def addresses(study: Study) -> dict[str, Written]:
    """Every address that can be referred to; inherited ones lead to the quantity of the parent."""
    found = {f"shared.{name}": written for name, written in study.shared.items()}
    for name, scenario in study.scenario.items():
        found[f"{name}.splitting"] = scenario.splitting
        for address, table in tables_of(study, name):
            found |= {f"{address}.{key}": written for key, written in table.quantities.items()}
    return found


def tables_of(study: Study, name: str) -> Iterator[tuple[str, Table]]:
    """Every table of a scenario with its address."""
    scenario = study.scenario[name]
    for part in ("line", "technique", "switching", "samples", "schedule"):
        yield f"{name}.{part}", getattr(scenario, part)
    for entry, table in scenario.systematics.items():
        yield f"{name}.systematics.{entry}", table
    for entry, table in scenario.reference.items():
        yield f"{name}.reference.{entry}", table
    if scenario.technique_b is not None:
        yield f"{name}.arm_b.technique", scenario.technique_b
    if scenario.samples_b is not None:
        yield f"{name}.arm_b.samples", scenario.samples_b


class Places:
    """Looks up references."""

    def __init__(self, study: Study) -> None:
        self.known = addresses(study)

    def find(self, reference: str) -> Written | None:
        """The quantity that @reference means: a full address, or a name of [shared]."""
        return self.known.get(reference) or self.known.get(f"shared.{reference}")

    def names(self) -> list[str]:
        """Everything that a reference may say."""
        return [*self.known, *(name.removeprefix("shared.") for name in self.known if name.startswith("shared."))]

    def origin(self, address: str) -> str:
        """The address whose quantity this one repeats word for word, as an inherited key of a resolved study does."""
        way: set[str] = set()
        while address in self.known and address not in way:
            way.add(address)
            quantity = self.known[address].quantity
            target = None if quantity.times or quantity.scale else self.find(quantity.reference)
            if target is None or target.address.partition(".")[2] != address.partition(".")[2]:
                break
            address = target.address
        return address

    def along_line(self, quantity: Quantity, way: tuple[str, ...] = ()) -> bool:
        """Whether a quantity is in FWHM, here or where it refers to."""
        if not quantity.reference or quantity.reference in way:
            return quantity.along_line
        target = self.find(quantity.reference)
        return target is not None and self.along_line(target.quantity, (*way, quantity.reference))

    def law(self, quantity: Quantity) -> Law | None:
        """The law of a quantity, or of what it refers to; None for products, scales and ensembles."""
        way: set[str] = set()
        while quantity.reference and quantity.reference not in way and not (quantity.times or quantity.scale):
            way.add(quantity.reference)
            target = self.find(quantity.reference)
            if target is None:
                return None
            quantity = target.quantity
        return None if quantity.times or quantity.scale else quantity.law

    def dimension(self, quantity: Quantity, way: tuple[str, ...] = ()) -> Dimension | None:
        """Dimension of a quantity with all its factors; None where it cannot be known."""
        base: Dimension | None
        if quantity.reference:
            target = None if quantity.reference in way else self.find(quantity.reference)
            if target is None:
                return None
            base = self.dimension(target.quantity, (*way, quantity.reference))
        elif quantity.members:
            base = quantity.members[0][1].dimension
        else:
            base = quantity.dimension
        for factor in quantity.times:
            inner = self.dimension(factor, way)
            base = None if base is None or inner is None else product(base, inner)
        return base


def product(first: Dimension, second: Dimension) -> Dimension:
    """The dimension of a product."""
    powers = dict(first)
    for name, power in second:
        powers[name] = powers.get(name, 0.0) + power
    return tuple(sorted((name, power) for name, power in powers.items() if power != 0.0))


def fits(dimension: Dimension | None, unit: str) -> bool:
    """Whether a known dimension is that of a canonical unit."""
    if dimension is None or unit == "*":
        return True
    try:
        return dimension == dimension_of(unit)
    except QuantityError:
        return False


def dimension_text(dimension: Dimension) -> str:
    """A dimension as people write it."""
    if not dimension:
        return "a plain number"
    names = {
        "[time]": "time",
        "[length]": "length",
        "[mass]": "mass",
        "[temperature]": "temperature",
        "[substance]": "amount",
    }
    return " ".join(names.get(name, name) + ("" if power == 1.0 else f"^{power:g}") for name, power in dimension)
