"""Every declared key, wrong in every way: exactly one fault, at its own line and address."""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping
from typing import Any

import pytest

from pvfeas import StudyError, problem_of
from pvfeas.errors import Fault
from pvfeas.keys import Key, keys_of
from pvfeas.line import COMPOSED, VOIGT
from pvfeas.study import Study
from pvfeas.tables import Goal, Line, Reference, Samples, Schedule, Switching, Systematic
from pvfeas.techniques import TECHNIQUES

Tables = dict[str, dict[str, Any]]
PARTS: dict[str, type] = {"line": Line, "switching": Switching, "samples": Samples, "schedule": Schedule}
TECHNIQUE: dict[str, dict[str, Any]] = {
    "quoted": {"kind": "quoted", "uncertainty": "0.5 Hz ×/ 1.3", "after": "1 h", "of": "one enantiomer"},
    "ramsey": {"kind": "ramsey", "free_time": "10 ms", "contrast": "0.6(1)", "molecules": "400 ×/ 1.5"},
    "two-point": {"kind": "two-point", "snr": "80 ×/ 1.3", "time": "0.2 s"},
    "free-decay": {
        "kind": "free-decay",
        "decay_time": "40(5) ms",
        "record": "80 ms",
        "snr": "5 ×/ 1.3",
        "sample_interval": "10 µs",
    },
    "scan": {"kind": "scan", "snr": "80 ×/ 1.3", "points": 60, "span": "50 kHz", "time": "2 s"},
}
SHOT = {"kind": "scan", "noise": "shot", "counts": "900 ×/ 1.2", "points": 60, "span": "50 kHz", "time": "2 s"}
DETECT = {"kind": "detect", "significance": 5, "power": 0.9, "within": "60 d"}
EXCLUDE = {"kind": "exclude", "power": 0.9, "within": "60 d"}
MEASURE = {"kind": "measure", "relative_uncertainty": 0.2, "power": 0.9, "within": "60 d"}
NEEDS_GOAL = {"limit": EXCLUDE, "construction": EXCLUDE, "relative_uncertainty": MEASURE}
NEEDS_AVERAGES = {"every": {"averages": "per reset", "every": "1 d"}, "after": {"averages": "as 1/t", "after": "1 d"}}

MADE_OF = {
    "natural": "2 kHz", "pressure": "0.1 Pa", "pressure_coefficient": "80 kHz/Pa", "saturation": 0.5, "laser": "1 kHz",
    "beam_radius": "5 mm", "speed": "50 m/s", "temperature": "4 K", "mass": "300 u",
}  # fmt: skip
PATTERN = {"pattern": "ABBA", "dwell": "20 s"}
BOTH = {"mode": "simultaneous", "rejection": 30}
REFERENCE = {
    "h": {"kind": "white", "h": 9}, "rate": {"kind": "drift", "rate": "0.1 Hz/s"},
    "table": {"kind": "table", "table": [["1 s", "3 Hz"], ["10 s", "1 Hz"]]},
}  # fmt: skip


def good(table: str, kind: str, key: str) -> Tables:
    """A study that is right and in which the key makes sense."""
    technique = TECHNIQUE[kind]
    if kind == "scan" and key in ("counts", "background"):
        technique = SHOT
    if kind == "two-point" and key in ("counts", "background"):
        technique = {"kind": "two-point", "noise": "shot", "counts": "900 ×/ 1.2", "time": "0.2 s"}
    if kind == "two-point" and key in ("molecules", "contrast"):
        technique = {"kind": "two-point", "noise": "projection", "molecules": "900 ×/ 1.2", "time": "0.2 s"}
    if key == "rate" and table == "technique":
        technique = {name: value for name, value in technique.items() if name != "molecules"} | {"rate": "80 1/s"}
    line = {"frequency": "29.1 THz", "fwhm": "12(2) kHz"}
    if key == "hwhm":
        line = {"frequency": "29.1 THz", "hwhm": "6(1) kHz"}
    if table == "line" and key in (*VOIGT, *COMPOSED):
        line = {"frequency": "29.1 THz"} | ({"lorentzian": "3 kHz", "gaussian": "5 kHz"} if key in VOIGT else MADE_OF)
        instead = {"lifetime": "natural", "pressure_half_coefficient": "pressure_coefficient"}.get(key)
        line = {key: "80 µs" if key == "lifetime" else "40 kHz/Pa"} | line if instead else line
        line.pop(instead or "", None)
    floor = {"size": "0.1 Hz ×/ 1.5", "averages": "never"}
    more: Tables = {"switching": dict(BOTH if key == "rejection" else PATTERN)} if table == "switching" else {}
    if table == "reference.laser":
        more = {"switching": dict(PATTERN), table: dict(REFERENCE.get(key, {"kind": "white", "allan": "3 Hz"}))}
    return more | {
        "goal": dict(NEEDS_GOAL.get(key, DETECT) if table == "goal" else DETECT),
        "line": line,
        "technique": dict(technique),
        "samples": {"mass": "2 g", "consumption": "8 mg/h"},
        "systematics.floor": floor | (NEEDS_AVERAGES.get(key, {}) if table == "systematics.floor" else {}),
    }


def toml(value: Any) -> str:
    if isinstance(value, bool):
        return str(value).lower()
    if isinstance(value, list):
        return "[" + ", ".join(toml(one) for one in value) + "]"
    return f'"{value}"' if isinstance(value, str) else str(value)


def written(tables: Mapping[str, Mapping[str, Any]], more: str = "") -> str:
    """A study with one key a line."""
    lines = ["[goal]", *(f"{name} = {toml(value)}" for name, value in tables["goal"].items())]
    lines += ["[scenario.first]", 'splitting = { value = "1 Hz ×/ 2", of = "difference" }']
    for table, content in tables.items():
        if table != "goal":
            lines += [f"[scenario.first.{table}]", *(f"{name} = {toml(value)}" for name, value in content.items())]
    return "\n".join([*lines, *([more] if more else [])]) + "\n"


def line_of(text: str, header: str, key: str) -> int:
    """The line of a key below a table's header, by search."""
    lines = text.splitlines()
    start = lines.index(header)
    return next(i for i in range(start, len(lines)) if lines[i].startswith(f"{key} = ")) + 1


def outside(key: Key) -> Iterator[Any]:
    """Values just beyond the bounds, as they would be written."""
    unit = "" if key.unit == "1" else f" {key.unit}"

    def shown(value: float) -> Any:
        if key.sort == "integer":
            return int(value)
        return f"{value:g}{unit}" if unit else value

    if math.isfinite(key.lower):
        yield shown(key.lower if key.lower_open else key.lower - 0.5 if key.sort == "quantity" else key.lower - 1)
        yield shown(key.lower - 2)
    if math.isfinite(key.upper):
        yield shown(key.upper if key.upper_open else key.upper + 1)


def wrong(key: Key) -> Iterator[tuple[str, Any]]:
    """(what is wrong, value) for a key."""
    if key.sort == "quantity":
        yield "wrong dimension", "3 s" if key.unit == "kg" else "3 kg"
        yield "unknown unit", "3 furlong"
        yield "flag for a quantity", True
        yield "not readable", "about three"
        if key.unit != "1":
            yield "no unit", 3
        if not key.many:
            yield "list for a quantity", [3]
    elif key.sort == "choice":
        yield "word not in the list", "whatever"
        yield "number for a word", 5
    elif key.sort == "choices":
        yield "word not in the list", ["whatever"]
        yield "text for a list", "amplitude"
    elif key.sort == "integer":
        yield "text for a whole number", "two"
        yield "fraction for a whole number", 1.5
    elif key.sort == "flag":
        yield "text for a flag", "yes"
    elif key.sort == "pairs":
        yield "text for a list", "about three"
        yield "triples", [["1 s", "3 Hz", "4 Hz"]]
        yield "wrong dimension", [["1 s", "3 kg"]]
        yield "not exact", [["1 s", "3(1) Hz"]]
    else:
        yield "number for a text", 5
    if key.sort in ("quantity", "integer"):
        for value in outside(key):
            yield f"out of bounds {value}", value


def fields() -> Iterator[tuple[str, str, str, Key]]:
    """(table, technique, key, declaration) of everything that a study may hold."""
    for table, part in {"goal": Goal, **PARTS, "systematics.floor": Systematic, "reference.laser": Reference}.items():
        for name, key in keys_of(part).items():
            yield table, "scan", name, key
    yield "line", "scan", "hwhm", keys_of(Line)["fwhm"]
    for kind, technique in TECHNIQUES.items():
        for name, key in keys_of(technique).items():
            yield "technique", kind, name, key


FIELDS = list(fields())
IDS = [f"{table}.{name}" if table != "technique" else f"{kind}.{name}" for table, kind, name, _ in FIELDS]
WRONG = [(table, kind, name, why, value) for table, kind, name, key in FIELDS for why, value in wrong(key)]
WRONG_IDS = [f"{kind if table == 'technique' else table}.{name}: {why}" for table, kind, name, why, _ in WRONG]


def faults_in(text: str) -> tuple[Fault, ...]:
    with pytest.raises(StudyError) as caught:
        problem_of(Study.from_toml(text))
    return caught.value.faults


def header_and_address(table: str, name: str) -> tuple[str, str]:
    if table == "goal":
        return "[goal]", f"goal.{name}"
    return f"[scenario.first.{table}]", f"first.{table}.{name}"


def expect_one(text: str, header: str, address: str) -> Fault:
    faults = faults_in(text)
    assert len(faults) == 1, "\n".join(str(fault) for fault in faults)
    assert faults[0].address == address, str(faults[0])
    assert faults[0].line == line_of(text, header, address.rpartition(".")[2]), str(faults[0])
    assert faults[0].wanted
    return faults[0]


def example(name: str, key: Key, tables: Tables, table: str) -> Any:
    """What the key holds in a right study."""
    if name in tables.get(table, {}):
        return tables[table][name]
    if key.sort == "choices":
        return list(key.default) if isinstance(key.default, tuple) else []
    if key.sort in ("choice", "flag", "integer"):
        return key.default if key.default is not None else key.choices[0]
    if key.sort == "text":
        return "one"
    plain = str(key.example or key.default or "10")
    if key.unit != "1":
        return plain if " " in plain else f"{plain} {key.unit}"
    return plain


def test_every_key_is_tried() -> None:
    assert len(FIELDS) >= 55
    assert len(WRONG) >= 250


@pytest.mark.parametrize(("table", "kind", "name", "key"), FIELDS, ids=IDS)
def test_right(table: str, kind: str, name: str, key: Key) -> None:
    """The study without a fault, so that the fault tested below is the only one."""
    tables = good(table, kind, name)
    tables.setdefault(table, {})[name] = example(name, key, tables, table)
    assert problem_of(Study.from_toml(written(tables))).scenarios


@pytest.mark.parametrize(("table", "kind", "name", "key"), FIELDS, ids=IDS)
def test_misspelt(table: str, kind: str, name: str, key: Key) -> None:
    tables = good(table, kind, name)
    value = example(name, key, tables, table)
    content = tables.setdefault(table, {})
    position = list(content).index(name) if name in content else len(content)
    entries = [entry for entry in content.items() if entry[0] != name]
    misspelt = name + name[-1]
    entries.insert(position, (misspelt, value))
    tables[table] = dict(entries)
    fault = expect_one(written(tables), *header_and_address(table, misspelt))
    assert f"did you mean {name}?" in fault.wanted


@pytest.mark.parametrize(("table", "kind", "name", "why", "value"), WRONG, ids=WRONG_IDS)
def test_wrong(table: str, kind: str, name: str, why: str, value: Any) -> None:
    tables = good(table, kind, name)
    tables.setdefault(table, {})[name] = value
    fault = expect_one(written(tables), *header_and_address(table, name))
    assert fault.found


INHERITABLE = [one for one in WRONG if one[0] != "goal" and not one[3].startswith("out of bounds -")]
INHERITABLE_IDS = [
    f"{kind if table == 'technique' else table}.{name}: {why}" for table, kind, name, why, _ in INHERITABLE
]


@pytest.mark.parametrize(("table", "kind", "name", "why", "value"), INHERITABLE, ids=INHERITABLE_IDS)
def test_wrong_in_a_child(table: str, kind: str, name: str, why: str, value: Any) -> None:
    """The parent is right; the fault stands in the child, at the child's line, once."""
    child = f'[scenario.child]\nbased_on = "first"\n[scenario.child.{table}]\n{name} = {toml(value)}\n'
    text = written(good(table, kind, name), child)
    expect_one(text, f"[scenario.child.{table}]", f"child.{table}.{name}")


@pytest.mark.parametrize(("table", "kind", "name", "why", "value"), INHERITABLE, ids=INHERITABLE_IDS)
def test_wrong_in_a_parent_is_said_once(table: str, kind: str, name: str, why: str, value: Any) -> None:
    """Two children inherit the fault; it is reported where it was written and nowhere else."""
    tables = good(table, kind, name)
    tables.setdefault(table, {})[name] = value
    children = '[scenario.one]\nbased_on = "first"\n[scenario.two]\nbased_on = "one"\n'
    expect_one(written(tables, children), *header_and_address(table, name))


ARM = [one for one in INHERITABLE if one[0] in ("technique", "samples")]
ARM_IDS = [f"{kind if table == 'technique' else table}.{name}: {why}" for table, kind, name, why, _ in ARM]


@pytest.mark.parametrize(("table", "kind", "name", "why", "value"), ARM, ids=ARM_IDS)
def test_wrong_in_arm_b(table: str, kind: str, name: str, why: str, value: Any) -> None:
    arm = f"[scenario.first.arm_b.{table}]\n{name} = {toml(value)}\n"
    text = written(good(table, kind, name), arm)
    expect_one(text, f"[scenario.first.arm_b.{table}]", f"first.arm_b.{table}.{name}")
