"""What a scenario inherits: based_on, without and --set act on what was written, before anything is validated."""

from __future__ import annotations

import tomllib
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Any

from pvfeas.suggestions import did_you_mean
from pvfeas.vocabulary import ALTERNATIVES, SCENARIO

Path = tuple[str, ...]
COMMAND_LINE = "--set"


@dataclass(frozen=True)
class Leaf:
    """A value with the address and line where it was written."""

    value: Any
    address: str
    line: int
    file: str


Node = dict[str, Any]  # of Leaf and further nodes
Complain = Any  # Callable[[str, int, str, str, str], None]: file is chosen by the collector


@dataclass(frozen=True)
class Tree:
    """One scenario as a tree of leaves: splitting, and tables of keys; systematics and arm_b are one deeper."""

    name: str
    line: int
    parent: str
    nodes: Node
    lines: Mapping[str, int]  # of the tables


DEEP = ("systematics", "arm_b", "reference")  # tables of tables


def own_tree(name: str, raw: Any, lines: Mapping[Path, int], file: str) -> Tree:
    """What was written for a scenario itself; anything that is no table where one belongs stays a leaf."""
    prefix: Path = ("scenario", name)
    nodes: Node = {}
    content = raw if isinstance(raw, dict) else {}
    for key, value in content.items():
        if key in ("based_on", "without"):
            continue
        nodes[key] = _grow(value, key, (*prefix, key), f"{name}.{key}", lines, file)
    tables = {key: lines.get((*prefix, key), lines.get(prefix, 0)) for key in SCENARIO}
    parent = content.get("based_on", "")
    return Tree(name, lines.get(prefix, 0), parent if isinstance(parent, str) else "", nodes, tables)


def _grow(value: Any, key: str, path: Path, address: str, lines: Mapping[Path, int], file: str) -> Any:
    depth = 0 if key == "splitting" or key not in SCENARIO else 2 if key in DEEP else 1
    return _branch(value, depth, path, address, lines, file)


def _branch(value: Any, depth: int, path: Path, address: str, lines: Mapping[Path, int], file: str) -> Any:
    if depth > 0 and isinstance(value, Set) and isinstance(value.value, dict):
        value = {key: Set(inner) for key, inner in value.value.items()}
    if depth == 0 or not isinstance(value, dict):
        return leaf(value, address, lines.get(path, 0), file)
    return {
        key: _branch(inner, depth - 1, (*path, key), f"{address}.{key}", lines, file) for key, inner in value.items()
    }


@dataclass(frozen=True)
class Set:
    """A value given by --set."""

    value: Any


def leaf(value: Any, address: str, line: int, file: str) -> Leaf:
    """A leaf of the file, or of the command line where --set gave it or a part of it."""
    if isinstance(value, Set):
        return Leaf(value.value, address, 0, COMMAND_LINE)
    if isinstance(value, dict) and any(isinstance(inner, Set) for inner in value.values()):
        parts = {key: inner.value if isinstance(inner, Set) else inner for key, inner in value.items()}
        return Leaf(parts | {"status": "assumed", "source": "command line"}, address, 0, COMMAND_LINE)
    return Leaf(value, address, line, file)


def merge(parent: Node, child: Node, key: str = "") -> Node:
    """Tables merge; a quantity, text or list is replaced whole; a technique of another kind replaces the table."""
    if key == "technique" and _kind(child) not in ("", _kind(parent)):
        return dict(child)
    merged = dict(parent)
    for name in child:
        for group in ALTERNATIVES:
            if name in group and key in ("line", "technique"):
                for other in group - {name}:
                    merged.pop(other, None)
    for name, value in child.items():
        old = merged.get(name)
        merged[name] = merge(old, value, name) if isinstance(old, dict) and isinstance(value, dict) else value
    return merged


def _kind(node: Node) -> str:
    kind = node.get("kind")
    return kind.value if isinstance(kind, Leaf) and isinstance(kind.value, str) else ""


def without(nodes: Node, entries: Sequence[str]) -> tuple[Node, list[str]]:
    """The tree without the named entries, and the entries that it does not have."""
    kept, missing = _copy(nodes), []
    for entry in entries:
        *way, last = entry.split(".")
        place: Any = kept
        for step in way:
            place = place.get(step, {}) if isinstance(place, dict) else {}
        if isinstance(place, dict) and last in place:
            del place[last]
        else:
            missing.append(entry)
    return kept, missing


def _copy(node: Any) -> Any:
    return {key: _copy(value) for key, value in node.items()} if isinstance(node, dict) else node


def entries_of(node: Node, prefix: str = "") -> Iterator[str]:
    """Every dotted entry of a tree."""
    for key, value in node.items():
        yield f"{prefix}{key}"
        if isinstance(value, dict):
            yield from entries_of(value, f"{prefix}{key}.")


def effective(trees: Mapping[str, Tree], raw: Mapping[str, Any], complain: Complain) -> dict[str, Tree]:
    """Every scenario with what it inherits; cycles and unknown parents are complained about and cut."""
    done: dict[str, Tree] = {}

    def visit(name: str, way: tuple[str, ...]) -> Tree:
        if name in done:
            return done[name]
        tree = trees[name]
        content = raw[name] if isinstance(raw[name], dict) else {}
        nodes = tree.nodes
        if tree.parent in way or tree.parent == name:
            loop = " -> ".join(
                [*way[way.index(tree.parent) :], name, tree.parent] if tree.parent in way else [name, name]
            )
            complain(
                ("scenario", name, "based_on"),
                f"{name}.based_on",
                f"a circle: {loop}",
                "based_on must end at a scenario of its own",
            )
            for member in way:
                done.setdefault(member, trees[member])
        elif tree.parent in trees:
            inherited, missing = without(visit(tree.parent, (*way, name)).nodes, _without_list(content))
            for entry in missing:
                known = list(entries_of(visit(tree.parent, (*way, name)).nodes))
                hint = did_you_mean(entry, known) or f"{tree.parent} has no such entry"
                complain(
                    ("scenario", name, "without"), f"{name}.without", f"{entry!r} is not there to be dropped", hint
                )
            nodes = merge(inherited, tree.nodes)
        done[name] = replace(tree, nodes=nodes)
        return done[name]

    for name in trees:
        visit(name, ())
    return done


def _without_list(content: Mapping[str, Any]) -> list[str]:
    found = content.get("without", [])
    return [one for one in found if isinstance(one, str)] if isinstance(found, list) else []


def value_of_setting(text: str) -> Any:
    """A value of --set: TOML where it begins with { or [, else the text itself. tomllib.TOMLDecodeError if not TOML."""
    stripped = text.strip()
    if stripped[:1] in ("{", "["):
        return tomllib.loads(f"value = {stripped}")["value"]
    return stripped
