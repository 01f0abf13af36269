"""From leaves to typed tables: every key checked against its declaration."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from typing import Any

from pvfeas.errors import QuantityError
from pvfeas.faults import Faults
from pvfeas.inheritance import COMMAND_LINE, Leaf, Node
from pvfeas.keys import Key
from pvfeas.laws import Exact
from pvfeas.quantity import Quantity, parse
from pvfeas.study import Table, Written
from pvfeas.suggestions import did_you_mean, suggest
from pvfeas.units import wanted
from pvfeas.vocabulary import LATER, LATER_CHOICES, LATER_KINDS, keys_for, later_keys

SORTS = {
    "choice": "a text in quotes", "choices": "a list of texts", "flag": "true or false",
    "integer": "a whole number", "text": "a text in quotes", "pairs": "a list of pairs",
}  # fmt: skip
OF_A_QUANTITY = ("source", "status", "note", "demonstrated")


class Reader:
    """Reads leaves once each; faults go to the collector."""

    def __init__(self, faults: Faults) -> None:
        self.faults = faults
        self.known: dict[tuple[str, str], Any] = {}
        self.said: set[tuple[str, str]] = set()

    def complain(self, leaf: Leaf, found: str, wanted_: str, key: str = "") -> None:
        """A fault at a leaf, or at a key inside it, reported where it was written."""
        line = self.faults.line_inside(leaf.address, key, leaf.line) if key and leaf.line else leaf.line
        self.faults.add(
            line, f"{leaf.address}.{key}" if key not in ("", "value") else leaf.address, found, wanted_, leaf.file
        )

    def table(self, node: Any, table: str, kind: str, scenario: str, address: str, line: int, parent: Any) -> Table:
        """One table: unknown keys, wrong values, missing keys."""
        if isinstance(node, Leaf):
            self.complain(node, f"{_short(node.value)} where a table belongs", f"write {table} = {{ … }}")
            return Table(line=line, written=True)
        content: Node = node or {}
        keys = keys_for(table, kind)
        quantities: dict[str, Written] = {}
        options: dict[str, Any] = {}
        absorbed: set[str] = set()
        for name, leaf in content.items():
            if name == "kind" and table == "technique":
                continue
            if name not in keys:
                absorbed |= self.unknown(name, leaf, keys, table, kind)
                continue
            if isinstance(leaf, dict):
                leaf = Leaf(_plain(leaf), f"{address}.{name}", line, self.faults.file)
            value = self.value(leaf, keys[name])
            if keys[name].sort == "quantity":
                quantities |= {name: value} if value is not None else {}
            elif value is not None:
                options[name] = value
        for name, key in keys.items():
            if key.required and name not in content and name not in absorbed and not _misses(parent, name):
                self.faults.add(line, f"{address}.{name}", "is missing", _example(name, key))
        return Table(quantities=quantities, options=options, kind=kind, line=line, written=bool(content))

    def unknown(self, name: str, leaf: Any, keys: Mapping[str, Key], table: str, kind: str) -> set[str]:
        """Complain about an unknown key; the missing key it was meant for, if any, is absorbed."""
        first = leaf if isinstance(leaf, Leaf) else _first_leaf(leaf)
        first = Leaf(first.value, _up(first, name), first.line, first.file)
        near = suggest(name, [one for one in keys if one != "name"])
        if name in later_keys(table, kind):
            self.complain(first, f"the key {name!r} {LATER}", "drop it for now")
            return set()
        if name in OF_A_QUANTITY and not near:
            what = 'write it with its quantity: size = { value = "0.1 Hz", source = "…", status = "assumed" }'
            self.complain(first, f"the key {name!r} stands beside a quantity here", what)
            return set()
        known = ", ".join(one for one in keys if one != "name")
        self.complain(
            first, f"the key {name!r} is not known here", f"did you mean {near}?" if near else f"known keys are {known}"
        )
        return {near}

    def value(self, leaf: Leaf, key: Key) -> Any:
        """The value of a leaf by its declaration; None where it is wrong (said) ."""
        mark = (leaf.address, key.sort + key.unit)
        if mark not in self.known:
            self.known[mark] = self.quantity(leaf, key) if key.sort == "quantity" else self.option(leaf, key)
        return self.known[mark]

    def quantity(self, leaf: Leaf, key: Key, splitting: bool = False) -> Written | None:
        """A quantity, its unit checked."""
        value = leaf.value
        if leaf.file == COMMAND_LINE and isinstance(value, str):
            value = {"value": value, "status": "assumed", "source": "command line"}
        try:
            found = parse(value, key.unit, key.along_line, splitting)
        except QuantityError as error:
            self.complain(leaf, error.found, error.wanted, error.key)
            return None
        return Written(address=leaf.address, line=leaf.line, file=leaf.file, quantity=found, unit=key.unit)

    def option(self, leaf: Leaf, key: Key) -> Any:
        """A word, a list of words, a flag, a whole number or a text."""
        value = _from_command_line(leaf, key)
        if key.sort == "integer":
            if isinstance(value, bool) or not isinstance(value, int):
                return self.complain(leaf, f"{_short(value)}", f"{SORTS['integer']} is needed")
            if not key.lower <= value <= key.upper:
                return self.complain(
                    leaf, f"{value}", f"a whole number from {key.lower:.0f} to {key.upper:.0f} is needed"
                )
            return value
        if key.sort == "flag":
            return value if isinstance(value, bool) else self.complain(leaf, _short(value), "true or false is needed")
        if key.sort == "text":
            return value if isinstance(value, str) else self.complain(leaf, _short(value), "a text in quotes is needed")
        if key.sort == "choices":
            return self.words(leaf, value, key)
        if key.sort == "pairs":
            return self.pairs(leaf, value, key)
        return self.word(leaf, value, key)

    def words(self, leaf: Leaf, value: Any, key: Key) -> Any:
        """A list of words out of the allowed ones, in their declared order."""
        if not isinstance(value, list) or not all(isinstance(one, str) for one in value):
            return self.complain(leaf, _short(value), f"a list is needed, of {', '.join(key.choices)}")
        for one in value:
            if one not in key.choices:
                return self.complain(leaf, f"{one!r}", _choice_hint(one, key.choices))
        return tuple(one for one in key.choices if one in value)

    def pairs(self, leaf: Leaf, value: Any, key: Key) -> Any:
        """A list of pairs of exact quantities, as they were written."""
        units = key.unit.split(", ")
        good = isinstance(value, list) and value and all(isinstance(one, list) and len(one) == 2 for one in value)
        if not good:
            return self.complain(leaf, _short(value), 'a list of pairs is needed: [["1 s", "3 Hz"], ["10 s", "1 Hz"]]')
        for one in value:
            for text, unit in zip(one, units, strict=True):
                try:
                    law = parse(text, unit).law
                except QuantityError as error:
                    return self.complain(leaf, error.found, error.wanted)
                if not isinstance(law, Exact) or law.value <= 0:
                    return self.complain(leaf, _short(text), "exact positive values are needed in a table")
        return tuple((str(one[0]), str(one[1])) for one in value)

    def word(self, leaf: Leaf, value: Any, key: Key) -> Any:
        """One word out of the allowed ones."""
        if not isinstance(value, str):
            return self.complain(leaf, _short(value), f"one of {', '.join(key.choices)} is needed, in quotes")
        if value in key.choices:
            return value
        name = leaf.address.rpartition(".")[2]
        if value in LATER_CHOICES.get(name, ()):
            return self.complain(leaf, f"{value!r} {LATER}", f"use one of {', '.join(key.choices)}")
        return self.complain(leaf, f"{value!r}", _choice_hint(value, key.choices))

    def kind(self, node: Any, address: str, line: int, known: Iterable[str], parent: Any) -> str:
        """The kind of a technique; empty where it is missing or wrong (said)."""
        if isinstance(node, Leaf):
            self.complain(node, f"{_short(node.value)} where a table belongs", 'write technique = { kind = "…", … }')
            return ""
        leaf = (node or {}).get("kind")
        known = tuple(known)
        if leaf is None:
            near = next((name for name in node or {} if suggest(name, ("kind",))), "")
            if near and isinstance(node[near], Leaf):
                self.complain(node[near], f"the key {near!r} is not known here", "did you mean kind?")
            elif not _misses(parent, "kind") or parent is None:
                self.faults.add(line, f"{address}.kind", "is missing", f"one of {', '.join(known)} is needed")
            return ""
        if isinstance(leaf, Leaf) and isinstance(leaf.value, str):
            if leaf.value in known:
                return leaf.value
            if leaf.value in LATER_KINDS:
                self.complain(leaf, f"the technique {leaf.value!r} {LATER}", f"use one of {', '.join(known)}")
            else:
                self.complain(leaf, f"{leaf.value!r}", _choice_hint(leaf.value, known))
        elif isinstance(leaf, Leaf):
            self.complain(leaf, _short(leaf.value), f"one of {', '.join(known)} is needed, in quotes")
        return ""


def _choice_hint(word: str, words: Iterable[str]) -> str:
    words = tuple(words)
    return did_you_mean(word, words) or f"one of {', '.join(words)} is needed"


def _misses(parent: Any, name: str) -> bool:
    """Whether the parent's table lacks the key too, so that it was said there."""
    return isinstance(parent, dict) and name not in parent


def _example(name: str, key: Key) -> str:
    if key.sort == "quantity":
        shown = f'"{key.example}"' if key.example else "…"
        return f"write {name} = {shown} ({key.meaning}); {wanted(key.unit)}"
    if key.choices:
        return f"one of {', '.join(key.choices)} is needed"
    return f"{SORTS[key.sort]} is needed"


def _short(value: Any) -> str:
    """A value as it was written, cut to a readable length."""
    if isinstance(value, bool):
        text = str(value).lower()
    elif isinstance(value, str):
        text = f'"{value}"'
    elif isinstance(value, dict):
        text = "a table"
    elif isinstance(value, list):
        text = "a list"
    else:
        text = str(value)
    return text if len(text) <= 60 else text[:57] + "…"


def _plain(node: Any) -> Any:
    if isinstance(node, dict):
        return {key: _plain(value) for key, value in node.items()}
    return node.value if isinstance(node, Leaf) else node


def _first_leaf(node: Node) -> Leaf:
    for value in node.values():
        return value if isinstance(value, Leaf) else _first_leaf(value)
    return Leaf({}, "", 0, "")


def _up(leaf: Leaf, name: str) -> str:
    """The address of the key `name` that leads to a leaf."""
    parts = leaf.address.split(".")
    return ".".join(parts[: parts.index(name) + 1]) if name in parts else leaf.address


def _from_command_line(leaf: Leaf, key: Key) -> Any:
    """--set gives texts; whole numbers and flags are read from them."""
    value = leaf.value
    if leaf.file != COMMAND_LINE or not isinstance(value, str):
        return value
    if key.sort == "integer":
        return int(value) if value.lstrip("+-").isdigit() else value
    if key.sort == "flag":
        return {"true": True, "false": False}.get(value, value)
    return value


def written_quantities(tables: Iterable[Table | None]) -> Iterable[Written]:
    """Every quantity of the tables."""
    for table in tables:
        if table is not None:
            yield from table.quantities.values()


__all__ = ["Quantity", "Reader", "written_quantities"]
