"""JSON Schema of the study file, made from the declarations of the keys, for editors and other programs.

Two views: whole (what a study must hold; a scenario with based_on may leave out anything) and optional
(nothing is required: children and fragments). Units and laws are text to a schema; the loader reads them.
"""

from __future__ import annotations

import json
from collections.abc import Iterable, Mapping
from pathlib import Path
from typing import Any

from pvfeas.goals import NEEDED
from pvfeas.keys import Key
from pvfeas.quantity_table import KEYS, MOST_MEMBERS, PAIRS, STATUSES
from pvfeas.scenarios import OF
from pvfeas.techniques import TECHNIQUES
from pvfeas.units import EXAMPLES
from pvfeas.vocabulary import PARTS, keys_for

Schema = dict[str, Any]
DIALECT = "https://json-schema.org/draft/2020-12/schema"
FILES = {"study.schema.json": False, "study-optional.schema.json": True}  # name: everything optional
NAME = "^[A-Za-z0-9_-]+$"
INFINITE = float("inf")


def limits_text(key: Key) -> str:
    """The bounds of a key in words; empty where there are none."""
    unit = "" if key.unit == "1" else f" {key.unit}"
    ends = []
    if key.lower > -INFINITE:
        ends.append(f"{'above' if key.lower_open else 'at least'} {key.lower:g}{unit if key.lower else ''}")
    if key.upper < INFINITE and key.upper != 10**9:
        ends.append(f"{'below' if key.upper_open else 'at most'} {key.upper:g}{unit if key.upper else ''}")
    return ", ".join(ends)


def unit_text(key: Key) -> str:
    """What units a quantity may be written in; empty for a plain number and for words."""
    if key.sort != "quantity" or key.unit == "1":
        return ""
    return f"in {EXAMPLES.get(key.unit, key.unit)}{', or FWHM of the line' if key.along_line else ''}"


def default_text(key: Key) -> str:
    """What holds where the key is absent; empty where nothing does."""
    if key.default is None:
        return ""
    if isinstance(key.default, tuple):
        return f"{', '.join(key.default)} if absent"
    return f"{str(key.default).lower() if isinstance(key.default, bool) else key.default} if absent"


def describe(key: Key) -> str:
    """Meaning, units, bounds and default of a key, in one line."""
    required = "required" if key.required else ""
    return "; ".join(one for one in (key.meaning, unit_text(key), limits_text(key), default_text(key), required) if one)


def number_schema(key: Key) -> Schema:
    """A bare number within the bounds of a key."""
    schema: Schema = {"type": "integer" if key.sort == "integer" else "number"}
    if key.lower > -INFINITE:
        schema["exclusiveMinimum" if key.lower_open else "minimum"] = key.lower
    if key.upper < INFINITE:
        schema["exclusiveMaximum" if key.upper_open else "maximum"] = key.upper
    return schema


def key_schema(key: Key) -> Schema:
    """What one key may hold."""
    schema: Schema = {"description": describe(key)}
    if key.sort == "quantity":
        table = "quantity" if key.unit == "1" else "quantityWithUnit"
        forms: list[Schema] = [{"$ref": "#/$defs/text"}, {"$ref": f"#/$defs/{table}"}]
        return schema | {"anyOf": [number_schema(key), *forms] if key.unit == "1" else forms}
    if key.sort == "integer":
        return schema | number_schema(key)
    if key.sort == "choice":
        return schema | {"enum": list(key.choices)}
    if key.sort == "choices":
        return schema | {"type": "array", "items": {"enum": list(key.choices)}, "uniqueItems": True}
    if key.sort == "pairs":
        pair = {"type": "array", "items": {"type": "string"}, "minItems": 2, "maxItems": 2}
        return schema | {"type": "array", "items": pair, "minItems": 1}
    return schema | {"type": "boolean" if key.sort == "flag" else "string"}


def table_schema(properties: Mapping[str, Schema], required: Iterable[str] = ()) -> Schema:
    """A table that knows these keys and no other."""
    schema: Schema = {"type": "object", "properties": dict(properties), "additionalProperties": False}
    names = list(required)
    return schema | {"required": names} if names else schema


def declared(table: str, kind: str = "", optional: bool = False, more: Mapping[str, Schema] | None = None) -> Schema:
    """A table as its keys are declared."""
    keys = {name: key for name, key in keys_for(table, kind).items() if name != "name"}
    properties = dict(more or {}) | {name: key_schema(key) for name, key in keys.items()}
    required = () if optional else [*(more or {}), *(name for name, key in keys.items() if key.required)]
    return table_schema(properties, required)


def quantity_schemas() -> Schema:
    """Text, table form with and without a unit, and the splitting, which says what it belongs to."""
    text = {
        "type": "string",
        "minLength": 1,
        "maxLength": 1000,
        "description": "such as 60(5) kHz, 2 Hz ×/ 1.5, 1 .. 5 Hz, @name",
    }
    plain = {"anyOf": [{"type": "number"}, {"$ref": "#/$defs/text"}]}
    step = table_schema(dict.fromkeys(("with", "from", "exponent"), plain), ("with", "from", "exponent"))
    special: dict[str, Schema] = {
        "unit": {"type": "string"},
        **{name: {"type": "string"} for name in ("source", "note", "group")},
        "status": {"enum": list(STATUSES)},
        "law": {"enum": ["normal", "lognormal"]},
        "relative": {"type": "boolean", "description": "a fraction of the line's frequency"},
        "times": {"type": "array", "items": plain, "description": "further factors"},
        "scale": {"type": "array", "items": step, "description": "factors (with/from)^exponent"},
        "values": {"type": "object", "minProperties": 1, "maxProperties": MOST_MEMBERS, "additionalProperties": plain},
        "weights": {
            "anyOf": [
                {"type": "array", "items": {"type": "number", "exclusiveMinimum": 0}},
                {"type": "object", "additionalProperties": {"type": "number", "exclusiveMinimum": 0}},
            ]
        },
        "difference": {"type": "array", "items": {"type": "string"}, "minItems": 2, "maxItems": 2},
    }
    everything = {name: special.get(name, plain) for name in KEYS}
    properties = {name: schema for name, schema in everything.items() if name != "relative"}  # the splitting's alone
    one_start = {
        "oneOf": [
            *({"required": [key]} for key in ("value", "values", "difference")),
            *({"required": list(pair)} for pair in PAIRS),
        ]
    }
    table = table_schema(properties) | one_start
    # a bare number needs the key unit beside it where the quantity has a unit; a product may have it in a factor
    with_unit = table | {
        "if": {"properties": {"value": {"type": "number"}}, "required": ["value"]},
        "then": {"anyOf": [{"required": ["unit"]}, {"required": ["times"]}]},
    }
    of = {
        "enum": list(OF),
        "description": "nu(a) - nu(b), or the prediction for one enantiomer, which is half of it; required",
    }
    splitting = table_schema(everything | {"of": of}, ("of",)) | one_start
    return {"text": text, "quantity": table, "quantityWithUnit": with_unit, "splitting": splitting}


def goal_schema(optional: bool) -> Schema:
    """The goal; each kind needs keys of its own."""
    schema = declared("goal", optional=optional)
    properties = schema["properties"]
    for name, key in keys_for("goal").items():
        if key.sort == "quantity":
            one = (
                {"$ref": "#/$defs/text"}
                if key.unit != "1"
                else {"anyOf": [number_schema(key), {"$ref": "#/$defs/text"}]}
            )
            forms = [one, {"type": "array", "items": one, "minItems": 1}] if key.many else [one]
            properties[name] = {"description": describe(key), "anyOf": forms}
    if not optional:
        schema["allOf"] = [
            {"if": {"properties": {"kind": {"const": kind}}, "required": ["kind"]}, "then": {"required": list(keys)}}
            for kind, keys in NEEDED.items()
            if keys
        ]
    return schema


def technique_schema(optional: bool) -> Schema:
    """The technique: its kind decides which keys it knows; a child may leave the kind to its parent."""
    forms = []
    for kind, technique in TECHNIQUES.items():
        schema = declared("technique", kind, optional, {"kind": {"const": kind}})
        forms.append({"title": kind, "description": technique.summary} | schema)
    if optional:
        return {"anyOf": forms}
    chosen = [
        {"if": {"properties": {"kind": {"const": form["title"]}}}, "then": form} for form in forms
    ]  # the message is then about the kind that was meant
    return {"type": "object", "properties": {"kind": {"enum": list(TECHNIQUES)}}, "required": ["kind"], "allOf": chosen}


def systematic_schema(optional: bool) -> Schema:
    """One systematic: a size in Hz, or a plain number where on names what it is a fraction of."""
    schema = declared("systematics", optional=optional)
    fraction = key_schema(keys_for("systematics", "width")["size"])
    size = schema["properties"]["size"]
    schema["properties"]["size"] = {
        "description": size["description"],
        "anyOf": [*fraction["anyOf"], {"$ref": "#/$defs/quantityWithUnit"}],
    }
    if optional:
        return schema
    needs = {"per reset": "every", "as 1/t": "after", "grows": "after"}
    rules: list[Schema] = [
        {"if": {"properties": {"averages": {"const": how}}, "required": ["averages"]}, "then": {"required": [key]}}
        for how, key in needs.items()
    ]
    growing = {"averages": {"const": "grows"}, "on": {"const": "scale"}}
    rules.append({"not": {"properties": growing, "required": list(growing)}})
    relative = {"properties": {"on": {"enum": ["width", "frequency", "scale"]}}, "required": ["on"]}
    rules.append({"if": relative, "else": {"properties": {"size": size}}})
    return schema | {"allOf": rules}


def scenario_schema(optional: bool) -> Schema:
    """One way to measure; optional: as a child of another one, which holds the rest."""
    view = "Optional" if optional else ""
    line = declared("line", optional=optional)
    width = {"not": {"required": ["fwhm", "hwhm"]}}
    properties: dict[str, Schema] = {
        "based_on": {
            "type": "string",
            "pattern": NAME,
            "description": "the scenario that holds what is not written here",
        },
        "without": {"type": "array", "items": {"type": "string"}, "description": "inherited entries that are dropped"},
        "splitting": {"$ref": "#/$defs/splitting"},
        "technique": {"$ref": f"#/$defs/technique{view}"},
        **{part: line | width if part == "line" else declared(part, optional=optional) for part in PARTS},
        "systematics": {
            "type": "object",
            "propertyNames": {"pattern": NAME},
            "additionalProperties": {"$ref": f"#/$defs/systematic{view}"},
            "description": "named uncertainties that stand in the final budget",
        },
        "reference": {
            "type": "object",
            "propertyNames": {"pattern": NAME},
            "additionalProperties": declared("reference", optional=optional),
            "description": "frequency noise of the probe, by name",
        },
        "arm_b": table_schema(
            {"technique": {"$ref": "#/$defs/techniqueOptional"}, "samples": declared("samples", optional=True)}
        ),
    }
    return table_schema(properties, () if optional else ("splitting", "technique"))


def study_schema(optional: bool = False) -> Schema:
    """JSON Schema (2020-12) of a study file; optional: the view in which nothing is required."""
    correlation = table_schema(
        {
            "between": {
                "type": "array",
                "items": {"type": "string"},
                "minItems": 2,
                "maxItems": 2,
                "uniqueItems": True,
            },
            "rho": {"type": "number", "exclusiveMinimum": -1, "exclusiveMaximum": 1},
        },
        ("between", "rho"),
    )
    child = {"$ref": "#/$defs/scenarioOptional"}
    whole = {"if": {"required": ["based_on"]}, "then": child, "else": {"$ref": "#/$defs/scenario"}}
    study = table_schema(
        {
            "title": {"type": "string", "description": "what the study is about"},
            "goal": goal_schema(optional),
            "shared": {
                "type": "object",
                "additionalProperties": {
                    "anyOf": [{"type": "number"}, {"$ref": "#/$defs/text"}, {"$ref": "#/$defs/quantity"}]
                },
                "propertyNames": {"pattern": NAME},
                "description": "quantities that several scenarios use, as @name",
            },
            "scenario": {
                "type": "object",
                "minProperties": 1,
                "propertyNames": {"pattern": NAME, "not": {"enum": ["shared", "goal", "scenario", "title"]}},
                "additionalProperties": child if optional else whole,
            },
            "correlation": {"type": "array", "items": correlation},
        },
        () if optional else ("goal", "scenario"),
    )
    parts: Schema = {}
    for view, everything in (("", False), ("Optional", True)):
        parts |= {
            f"technique{view}": technique_schema(everything),
            f"systematic{view}": systematic_schema(everything),
            f"scenario{view}": scenario_schema(everything),
        }
    if optional:
        parts = {name: part for name, part in parts.items() if name.endswith("Optional")}
    title = "pvfeas study file" + (", every key optional (children, fragments)" if optional else "")
    return {"$schema": DIALECT, "title": title, **study, "$defs": quantity_schemas() | parts}


def schema_text(optional: bool = False) -> str:
    """The schema as it stands in its file."""
    return json.dumps(study_schema(optional), indent=1, ensure_ascii=False, allow_nan=False) + "\n"


def write_schemas(folder: Path) -> tuple[Path, ...]:
    """Write both views into a folder; the paths written."""
    written = []
    for name, optional in FILES.items():
        path = folder / name
        path.write_text(schema_text(optional), encoding="utf-8", newline="\n")
        written.append(path)
    return tuple(written)
