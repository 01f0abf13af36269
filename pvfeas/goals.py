"""The goal of a study: plain numbers, and the rules between its keys."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from typing import TYPE_CHECKING, Any

from pvfeas.errors import QuantityError
from pvfeas.faults import Faults
from pvfeas.inheritance import Leaf
from pvfeas.keys import Key
from pvfeas.laws import Exact
from pvfeas.limits import SIGNED
from pvfeas.quantity import parse
from pvfeas.showing import digits
from pvfeas.units import wanted

if TYPE_CHECKING:
    from pvfeas.reading import Reader

NEEDED = {
    "detect": ("significance", "power"),
    "sign": ("significance", "power"),
    "measure": ("relative_uncertainty",),
    "exclude": (),
}
ONLY = {
    "limit": ("exclude",),
    "relative_uncertainty": ("measure",),
    "trials": ("detect", "sign"),
    "looks": ("detect", "sign"),
}
EXAMPLES = {"significance": "5", "power": "0.9", "relative_uncertainty": "0.2"}
LEAST_CONFIDENCE = 0.7  # of feldman-cousins-abs: below it small outcomes have no limit


def plain_numbers(name: str, leaf: Leaf, key: Key, reader: Reader) -> dict[str, Any]:
    """An exact number of the goal, or a rising tuple of them where a list may stand."""
    values = leaf.value if key.many and isinstance(leaf.value, list) else [leaf.value]
    if not values:
        reader.complain(leaf, "an empty list", wanted(key.unit))
        return {}
    found = []
    for value in values:
        number = _number(leaf, value, key, reader)
        if number is None:
            return {}
        found.append(number)
    return {name: tuple(sorted(set(found))) if key.many else found[0]}


def _number(leaf: Leaf, value: Any, key: Key, reader: Reader) -> float | None:
    try:
        quantity = parse(value, key.unit)
    except QuantityError as error:
        reader.complain(leaf, error.found, error.wanted)
        return None
    if not isinstance(quantity.law, Exact) or quantity.times or quantity.scale or quantity.relative:
        reader.complain(leaf, f'"{quantity.text}" is not exact', "a goal is a plain number without uncertainty")
        return None
    number = quantity.law.value
    outside = out_of_bounds(number, key)
    if outside:
        reader.complain(leaf, f"{digits(number)} is out of bounds", outside)
        return None
    return number


def out_of_bounds(value: float, key: Key) -> str:
    """What would be right, if a number lies outside its bounds; empty if it is inside."""
    low = value < key.lower or (key.lower_open and value == key.lower)
    high = value > key.upper or (key.upper_open and value == key.upper)
    return bounds_text(key) if low or high else ""


def bounds_text(key: Key) -> str:
    """The bounds in words."""
    above = f"above {key.lower:g}" if key.lower_open else f"at least {key.lower:g}"
    below = f"below {key.upper:g}" if key.upper_open else f"at most {key.upper:g}"
    unit = "" if key.unit == "1" else f" {key.unit}"
    if key.lower == -float("inf"):
        return f"a value {below}{unit} is needed"
    if key.upper == float("inf"):
        return f"a value {above}{unit} is needed"
    return f"a value {above} and {below}{unit} is needed"


def goal_faults(raw: Mapping[str, Any], made: Mapping[str, Any], absorbed: set[str], faults: Faults) -> None:
    """Complain where the keys of the goal do not go together."""
    for key, found, right in _rules(raw, made, absorbed):
        faults.at(("goal", key) if key in raw else ("goal",), f"goal.{key}", found, right)


def _rules(raw: Mapping[str, Any], made: Mapping[str, Any], absorbed: set[str]) -> Iterator[tuple[str, str, str]]:
    kind = made.get("kind")
    if kind is None:
        return
    for key in NEEDED[kind]:
        if key not in raw and key not in absorbed:
            yield key, "is missing", f'a goal of kind "{kind}" needs it: write {key} = "{EXAMPLES[key]}"'
    for key, kinds in ONLY.items():
        if key in raw and kind not in kinds:
            yield key, f"{key} in a goal of kind {kind!r}", f"it belongs to {' and '.join(kinds)}: drop it"
    construction, sides = made.get("construction"), made.get("sides", 2)
    if construction == "feldman-cousins-abs" and made.get("confidence", 0.95) < LEAST_CONFIDENCE:
        yield "confidence", f"{construction!r} below {LEAST_CONFIDENCE:g}", f"write at least {LEAST_CONFIDENCE:g}"
    if construction in SIGNED and sides == 2:
        yield "construction", f"{construction!r} with two sides", "it needs a predicted sign: write sides = 1"
    if construction is not None and construction not in SIGNED and sides == 1:
        yield "construction", f"{construction!r} with sides = 1", f"use {' or '.join(SIGNED)}, or drop sides"
