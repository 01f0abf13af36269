"""One scenario from its tree of leaves: tables, arms, and the rules between them."""

from __future__ import annotations

import re
from typing import Any

from pvfeas.inheritance import Leaf, Node, Tree, merge
from pvfeas.keys import keys_of
from pvfeas.line import COMPOSED, GIVEN, VOIGT, shape_of
from pvfeas.reading import Reader, _short
from pvfeas.study import Scenario, Table, Written
from pvfeas.suggestions import did_you_mean, suggest
from pvfeas.tables import Line, Reference, Switching
from pvfeas.techniques import TECHNIQUES
from pvfeas.vocabulary import ALTERNATIVES, PARTS, SCENARIO, SPLITTING

NAME = re.compile(r"[\w-]+")
WIDTHS = (*GIVEN, *VOIGT, *COMPOSED)
OF = ("difference", "one enantiomer")
HOW_SPLITTING = 'write splitting = { value = "1.1(3) Hz", of = "difference" } (or of = "one enantiomer")'


def read_scenario(tree: Tree, parent: Tree | None, own: Tree, reader: Reader) -> Scenario | None:
    """The typed scenario, or None where what is wrong (said) leaves nothing to work with."""
    nodes, name = tree.nodes, tree.name
    above: Node | None = parent.nodes if parent else None
    splitting = read_splitting(tree, above, reader)
    missing_technique = "technique" not in nodes
    technique = _technique(nodes.get("technique"), f"{name}.technique", own.lines["technique"], above, reader, name)
    if missing_technique and not _near_miss(nodes, "technique") and (above is None or "technique" in above):
        reader.faults.add(tree.line, f"{name}.technique", "is missing", 'write technique = { kind = "…", … }')
    tables = {
        part: reader.table(
            nodes.get(part), part, "", name, f"{name}.{part}", own.lines[part], above.get(part) if above else None
        )
        for part in PARTS
    }
    systematics = _entries("systematics", tree, own, above, reader)
    reference = _entries("reference", tree, own, above, reader)
    for part, kind in (("switching", Switching), ("line", Line)):
        node = nodes.get(part)
        if above is None or node is not above.get(part):
            _own_rules(kind, tables[part], node, f"{name}.{part}", own.lines[part], reader)
    technique_b, samples_b = _arm_b(nodes, tree, own, reader)
    _rules(tree, technique, tables, technique_b, above, reader)
    if reference and technique is not None:
        _reference_rules(tree, own, technique, tables["switching"], reference, reader)
    if splitting is None or technique is None:
        return None
    return Scenario(
        name=name, line_number=tree.line, based_on=tree.parent, splitting=splitting[0], splitting_of=splitting[1],
        technique=technique, systematics=systematics, reference=reference, technique_b=technique_b,
        samples_b=samples_b, **tables,
    )  # fmt: skip


def _near_miss(nodes: Node, wanted: str) -> bool:
    return any(suggest(key, SCENARIO) == wanted for key in nodes if key not in SCENARIO)


def read_splitting(tree: Tree, above: Node | None, reader: Reader) -> tuple[Written, str] | None:
    """The splitting and what it belongs to."""
    leaf = tree.nodes.get("splitting")
    if leaf is None:
        if not _near_miss(tree.nodes, "splitting") and (above is None or "splitting" in above):
            reader.faults.add(tree.line, f"{tree.name}.splitting", "is missing", HOW_SPLITTING)
        return None
    if not isinstance(leaf, Leaf):
        return None
    mark = (leaf.address, "splitting")
    if mark not in reader.known:
        reader.known[mark] = _splitting(leaf, reader)
    return reader.known[mark]  # type: ignore[no-any-return]  # what _splitting returned


def _splitting(leaf: Leaf, reader: Reader) -> tuple[Written, str] | None:
    value = leaf.value
    if not isinstance(value, dict):
        reader.complain(leaf, f"{_short(value)} does not say what it belongs to", HOW_SPLITTING)
        return None
    if "of" not in value:
        near = next((key for key in value if suggest(key, ("of",)) and len(key) <= 3), "")
        if near:
            reader.complain(leaf, f"the key {near!r} is not known here", "did you mean of?", near)
        else:
            reader.complain(
                leaf, "is missing", 'say of = "difference" (nu(a) - nu(b)) or of = "one enantiomer" (half of it)', "of"
            )
        return None
    if value["of"] not in OF:
        hint = did_you_mean(str(value["of"]), OF) or f"one of {', '.join(OF)} is needed"
        reader.complain(leaf, f"{_short(value['of'])} is neither", hint, "of")
        return None
    written = reader.quantity(leaf, SPLITTING, splitting=True)
    return None if written is None else (written, str(value["of"]))


def _technique(node: Any, address: str, line: int, above: Node | None, reader: Reader, scenario: str) -> Table | None:
    """The technique's table; rules of the technique itself are checked too."""
    if node is None:
        return None
    parent = above.get("technique") if above else None
    kind = reader.kind(node, address, line, TECHNIQUES, parent)
    if not kind:
        return None
    same = parent if isinstance(parent, dict) and _kind_of(parent) == kind else None
    table = reader.table(node, "technique", kind, scenario, address, line, same)
    given: dict[str, Any] = dict.fromkeys(node, True) | dict(table.options)
    before: set[tuple[str, str]] = set()
    if same is not None:
        options = {key: leaf.value for key, leaf in same.items() if isinstance(leaf, Leaf)}
        before = {(key, found) for key, found, _ in TECHNIQUES[kind].rules({k: options.get(k, True) for k in same})}
    absorbed = {
        suggest(one, TECHNIQUES[kind].__dataclass_fields__)
        for one in node
        if one not in TECHNIQUES[kind].__dataclass_fields__
    }
    absorbed |= {other for group in ALTERNATIVES if group & absorbed for other in group}
    for key, found, right in TECHNIQUES[kind].rules(given):
        if (key, found) not in before and key not in absorbed:
            leaf = node.get(key)
            at = leaf.line if isinstance(leaf, Leaf) else line
            reader.faults.add(at, f"{address}.{key}", found, right, leaf.file if isinstance(leaf, Leaf) else None)
    return table


def _kind_of(node: Node) -> str:
    leaf = node.get("kind")
    return leaf.value if isinstance(leaf, Leaf) and isinstance(leaf.value, str) else ""


EXAMPLES = {
    "systematics": 'size = "0.1 Hz", averages = "never"',
    "reference": 'kind = "white", allan = "3 Hz"',
}


def _entries(part: str, tree: Tree, own: Tree, above: Node | None, reader: Reader) -> dict[str, Table]:
    """The named entries of the systematics or of the reference."""
    node = tree.nodes.get(part)
    if node is None:
        return {}
    if isinstance(node, Leaf):
        found = f"{_short(node.value)} where a table belongs"
        reader.complain(node, found, f"write [scenario.NAME.{part}] with entries name = {{ {EXAMPLES[part]} }}")
        return {}
    upper = above.get(part) if above else None
    made = {}
    for name, entry in node.items():
        address = f"{tree.name}.{part}.{name}"
        line = _line_of(entry, own.lines[part])
        if isinstance(entry, Leaf):
            reader.complain(entry, f"{_short(entry.value)} where a table belongs", f"write {{ {EXAMPLES[part]} }}")
            continue
        if not NAME.fullmatch(name):
            reader.faults.add(line, address, f"{_short(name)} cannot name an entry", "use letters, digits, _ and -")
            continue
        parent = upper.get(name) if isinstance(upper, dict) else None
        kind = _size_of(entry) if part == "systematics" else ""
        made[name] = reader.table(entry, part, kind, tree.name, address, line, parent)
        if parent is not None and entry is parent:
            continue
        if part == "systematics":
            _averages(made[name], entry, address, line, parent, reader)
        else:
            _own_rules(Reference, made[name], entry, address, line, reader)
    return made


def _own_rules(
    part: type[Switching] | type[Reference] | type[Line],
    table: Table,
    node: Any,
    address: str,
    line: int,
    reader: Reader,
) -> None:
    """What is wrong with the keys of one table taken together."""
    if not isinstance(node, dict):
        return
    known = [*keys_of(part), *("hwhm",)] if part is Line else list(keys_of(part))
    absorbed = {suggest(one, known) for one in node if one not in known}
    for key, found, right in part.rules(dict.fromkeys([*node, *absorbed], True) | dict(table.options)):
        if key not in absorbed:
            leaf = node.get(key)
            at, file = (leaf.line, leaf.file) if isinstance(leaf, Leaf) else (line, None)
            reader.faults.add(at, f"{address}.{key}", found, right, file)


def _reference_rules(
    tree: Tree, own: Tree, technique: Table, switching: Table, reference: dict[str, Table], reader: Reader
) -> None:
    """What reference noise needs of the rest of a scenario."""
    line, address = own.lines["reference"], f"{tree.name}.reference"
    written = tree.nodes.get("switching")
    given = set(written) if isinstance(written, dict) else set()
    if technique.kind == "quoted":
        right = "a quoted uncertainty holds everything: drop the reference"
        reader.faults.add(line, address, "reference noise for a quoted uncertainty", right)
    elif switching.options.get("mode") == "simultaneous":
        if "rejection" not in given:
            right = "say how well common noise cancels: write rejection = 30 in switching"
            reader.faults.add(line, address, "reference noise without rejection", right)
        for name, table in reference.items():
            if table.options.get("kind") == "drift":
                right = "it is common to both: give what is left of it as a systematic"
                reader.faults.add(table.line, f"{address}.{name}", "a drift with both enantiomers at once", right)
    elif "pattern" not in given and not any(suggest(one, ("pattern",)) for one in given):
        right = 'how it averages depends on the order: write switching = { pattern = "ABBA", dwell = "20 s" }'
        reader.faults.add(line, address, "reference noise without a switching pattern", right)


def _size_of(entry: Node) -> str:
    """What the size is a fraction of, which decides its unit."""
    leaf = entry.get("on")
    known = ("width", "frequency", "scale")
    return leaf.value if isinstance(leaf, Leaf) and leaf.value in known else ""


def _averages(table: Table, entry: Node, address: str, line: int, parent: Any, reader: Reader) -> None:
    """What each way of averaging needs, and what a size in Hz or as a fraction needs."""
    how = table.options.get("averages")
    needed = {"per reset": "every", "as 1/t": "after", "grows": "after"}.get(how or "")
    if needed and needed not in entry and not _near(entry, needed):
        reader.faults.add(
            line, f"{address}.{needed}", "is missing", f'averages = "{how}" needs it: write {needed} = "1 d"'
        )
    on = entry.get("on")
    if how == "grows" and isinstance(on, Leaf) and on.value == "scale":
        reader.complain(on, 'on = "scale" with averages = "grows"', "give the size in Hz, or another way to average")
    for key, ways in (("every", ("per reset",)), ("after", ("as 1/t", "grows"))):
        if key in entry and how is not None and how not in ways:
            leaf = entry[key]
            if isinstance(leaf, Leaf):
                reader.complain(leaf, f'{key} with averages = "{how}"', f"it belongs to {' and '.join(ways)}: drop it")


def _near(entry: Node, wanted: str) -> bool:
    return any(
        suggest(key, ("every", "after", "size", "averages", "of", "on", "group", "dof")) == wanted
        for key in entry
        if key != wanted
    )


def _line_of(entry: Any, otherwise: int) -> int:
    if isinstance(entry, dict):
        lines = [value.line for value in entry.values() if isinstance(value, Leaf) and value.line]
        return min(lines) if lines else otherwise
    return entry.line if isinstance(entry, Leaf) and entry.line else otherwise


def _arm_b(nodes: Node, tree: Tree, own: Tree, reader: Reader) -> tuple[Table | None, Table | None]:
    """What arm b overrides, merged over arm a as a child does."""
    node = nodes.get("arm_b")
    if node is None:
        return None, None
    address, line = f"{tree.name}.arm_b", own.lines["arm_b"]
    if isinstance(node, Leaf):
        reader.complain(
            node, f"{_short(node.value)} where a table belongs", "write arm_b = { technique = { … }, samples = { … } }"
        )
        return None, None
    technique = samples = None
    for key, value in node.items():
        if key not in ("technique", "samples"):
            hint = did_you_mean(key, ("technique", "samples")) or "arm b overrides technique and samples"
            reader.faults.add(_line_of(value, line), f"{address}.{key}", f"the key {key!r} is not known here", hint)
        elif isinstance(value, Leaf):
            reader.complain(value, f"{_short(value.value)} where a table belongs", f"write {key} = {{ … }}")
        elif key == "technique":
            base = nodes.get("technique")
            merged = merge(base if isinstance(base, dict) else {}, value, "technique")
            same = base if isinstance(base, dict) and _kind_of(merged) == _kind_of(base) else None
            technique = _technique(
                merged,
                f"{address}.technique",
                _line_of(value, line),
                {"technique": same} if same else None,
                reader,
                tree.name,
            )
        else:
            base = nodes.get("samples")
            merged = merge(base if isinstance(base, dict) else {}, value, "samples")
            samples = reader.table(merged, "samples", "", tree.name, f"{address}.samples", line, base)
    return technique, samples


def _rules(
    tree: Tree, technique: Table | None, tables: dict[str, Table], technique_b: Table | None, above: Node | None,
    reader: Reader,
) -> None:  # fmt: skip
    """Rules between the tables of a scenario."""
    name, line = tree.name, tables["line"]
    if technique is not None:
        part = TECHNIQUES[technique.kind]
        written = tree.nodes.get("line")
        named = {suggest(key, WIDTHS) or key for key in written} if isinstance(written, dict) else set()
        inherits = (
            above is not None
            and isinstance(above.get("technique"), dict)
            and _kind_of(above["technique"]) == technique.kind
        )
        if part.needs_width and not isinstance(written, Leaf) and not named & set(WIDTHS) and not inherits:
            right = f'a {technique.kind} needs the width: write line = {{ fwhm = "12(2) kHz" }}'
            reader.faults.add(line.line, f"{name}.line.fwhm", "is missing", right)
        shape = shape_of({*named, *line.quantities}) or line.options.get("profile", "lorentzian")
        if shape == "voigt" and technique.options.get("detection", "direct") != "direct":
            found = f"detection = {technique.options['detection']!r} of a Voigt line"
            right = "only direct detection is known for it: give a Lorentzian or a Gaussian line, or direct"
            reader.faults.add(technique.line, f"{name}.technique.detection", found, right)
        stated = technique.kind == "quoted" and technique.options.get("of", "splitting") == "splitting"
        if stated and technique_b is not None:
            reader.faults.add(
                tree.lines["arm_b"],
                f"{name}.arm_b.technique",
                "an arm b for a quoted splitting",
                'the uncertainty is that of both arms: drop it, or quote of = "one enantiomer"',
            )
    samples = tables["samples"].quantities
    for one, other in (("mass", "consumption"), ("consumption", "mass")):
        if (
            one in samples
            and other not in samples
            and isinstance(tree.nodes.get("samples"), dict)
            and other not in tree.nodes["samples"]
        ):
            near = any(
                suggest(key, ("mass", "consumption", "ee_a", "ee_b")) == other
                for key in tree.nodes["samples"]
                if key not in samples
            )
            if not near:
                reader.faults.add(
                    samples[one].line,
                    samples[one].address,
                    f"{one} without {other}",
                    "the supply needs both: mass and consumption per live time",
                    samples[one].file,
                )
