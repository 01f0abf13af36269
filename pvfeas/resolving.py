"""The complete study as TOML: everything inherited and every default written out, reading back to the same answer."""

from __future__ import annotations

import hashlib
import json
import re
from collections.abc import Mapping
from typing import Any

from pvfeas.goals import ONLY
from pvfeas.keys import Key
from pvfeas.line import shape_of
from pvfeas.study import Scenario, Study, Table, Written
from pvfeas.tables import Goal
from pvfeas.vocabulary import keys_for

GOALS = Goal.kinds
BARE = re.compile(r"[A-Za-z0-9_-]+")


def resolve(study: Study) -> str:
    """The study with nothing left to inherit: what a scenario took from another reads "@address"."""
    lines = [f"title = {toml(study.title)}", "", *goal_lines(study)]
    if study.shared:
        lines += ["", "[shared]", *(f"{word(name)} = {toml(w.quantity.written)}" for name, w in study.shared.items())]
    for scenario in study.scenario.values():
        lines += ["", *scenario_lines(scenario)]
    for one in study.correlation:
        lines += ["", "[[correlation]]", f"between = {toml(list(one.between))}", f"rho = {one.rho!r}"]
    return "\n".join(lines) + "\n"


def study_hash(study: Study) -> str:
    """SHA-256 of the resolved text."""
    return hashlib.sha256(resolve(study).encode()).hexdigest()


def goal_lines(study: Study) -> list[str]:
    """The goal with its defaults, numbers in canonical units."""
    lines = ["[goal]"]
    for name, key in keys_for("goal").items():
        value = study.goal.get(name, key.default)
        if value is None or study.goal.get("kind") not in ONLY.get(name, GOALS):
            continue
        lines.append(f"{name} = {_goal_value(value, key)}")
    return lines


def _goal_value(value: Any, key: Key) -> str:
    if isinstance(value, tuple):
        return "[" + ", ".join(_goal_value(one, key) for one in value) + "]"
    if isinstance(value, float):
        return f'"{value!r}{"" if key.unit == "1" else " " + key.unit}"'
    return toml(value)


def scenario_lines(scenario: Scenario) -> list[str]:
    """One scenario."""
    name = scenario.name
    lines = [f"[scenario.{word(name)}]", f"splitting = {_splitting(scenario)}"]
    for part in ("line", "technique", "switching", "samples", "schedule"):
        table: Table = getattr(scenario, part)
        lines.append(f"{part} = {_table(table, part, f'{name}.{part}')}")
    for part, entries in (("reference", scenario.reference), ("systematics", scenario.systematics)):
        if entries:
            lines += ["", f"[scenario.{word(name)}.{part}]"]
        for entry, table in entries.items():
            lines.append(f"{word(entry)} = {_table(table, part, f'{name}.{part}.{entry}')}")
    if scenario.technique_b is not None or scenario.samples_b is not None:
        lines += ["", f"[scenario.{word(name)}.arm_b]"]
        if scenario.technique_b is not None:
            lines.append(f"technique = {_table(scenario.technique_b, 'technique', f'{name}.arm_b.technique')}")
        if scenario.samples_b is not None:
            lines.append(f"samples = {_table(scenario.samples_b, 'samples', f'{name}.arm_b.samples')}")
    return lines


def _splitting(scenario: Scenario) -> str:
    written, own = scenario.splitting, f"{scenario.name}.splitting"
    if written.address == own:
        return toml(written.quantity.written)
    content: dict[str, Any] = {"value": f"@{written.address}", "of": scenario.splitting_of}
    return toml(content | ({"relative": True} if written.quantity.relative else {}))


def _table(table: Table, part: str, address: str) -> str:
    on = str(table.options.get("on", ""))
    keys = keys_for(part, table.kind or on)
    content: dict[str, Any] = {"kind": table.kind} if part == "technique" else {}
    for name, key in keys.items():
        if name == "name":
            continue
        if name in table.quantities:
            content[name] = _reference(table.quantities[name], f"{address}.{name}")
        elif name in table.options:
            value = table.options[name]
            content[name] = _listed(value)
        elif part == "line" and name == "profile" and shape_of(set(table.quantities)):
            continue  # the parts say the shape
        elif key.default is not None and key.sort != "quantity":
            content[name] = list(key.default) if isinstance(key.default, tuple) else key.default
    return toml(content)


def _listed(value: Any) -> Any:
    return [_listed(one) for one in value] if isinstance(value, tuple | list) else value


def _reference(written: Written, own: str) -> Any:
    return written.quantity.written if written.address == own else f"@{written.address}"


def word(name: str) -> str:
    """A key, quoted where it must be."""
    return name if BARE.fullmatch(name) else json.dumps(name, ensure_ascii=False)


def toml(value: Any) -> str:
    """A value in TOML, tables inline."""
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, str):
        return json.dumps(value, ensure_ascii=False).replace("\x7f", "\\u007f")
    if isinstance(value, int):
        return str(value)
    if isinstance(value, float):
        return repr(value)
    if isinstance(value, Mapping):
        return (
            "{ " + ", ".join(f"{word(str(key))} = {toml(inner)}" for key, inner in value.items()) + " }"
            if value
            else "{}"
        )
    return "[" + ", ".join(toml(inner) for inner in value) + "]"
