"""JSON Schema of what assess and compare answer as JSON."""

from __future__ import annotations

import json
from collections.abc import Mapping
from pathlib import Path
from typing import Any

from pvfeas.results import SCHEMA_VERSION

Schema = dict[str, Any]
DIALECT = "https://json-schema.org/draft/2020-12/schema"
QUANTILES = ("q05", "q16", "q50", "q84", "q95")
TEXT: Schema = {"type": "string"}
NUMBER: Schema = {"type": "number"}
MAYBE: Schema = {"type": ["number", "null"]}
PROBABILITY: Schema = {"type": "number", "minimum": 0, "maximum": 1}


def said(schema: Schema, description: str) -> Schema:
    """A schema with its meaning."""
    return {"description": description, **schema}


def table(description: str, properties: Mapping[str, Schema], *optional: str) -> Schema:
    """An object with these keys and no others, all required but the optional ones."""
    required = [name for name in properties if name not in optional]
    return {
        "description": description,
        "type": "object",
        "properties": dict(properties),
        "required": required,
        "additionalProperties": False,
    }


def mapping(values: Schema, description: str) -> Schema:
    """An object whose keys are names."""
    return {"description": description, "type": "object", "additionalProperties": values}


def listed(items: Schema, description: str) -> Schema:
    """A list of alike things."""
    return {"description": description, "type": "array", "items": items}


def nullable(schema: Schema) -> Schema:
    """The schema, or null."""
    return {"description": schema["description"], "anyOf": [schema, {"type": "null"}]}


def unit(*units: str) -> Schema:
    """The unit of the numbers beside it."""
    return {"enum": list(units)}


MOMENT = table("a wall time", {"value": NUMBER, "unit": unit("s"), "clock": {"const": "wall"}})
ERRORS = mapping(MAYBE, "95 % half-widths of the numerical integration, in the unit of the number of that name")


def quantiles(description: str, *units: str) -> Schema:
    """The distribution of a quantity over the draws."""
    numbers = {name: said(MAYBE, f"{name[1:]} % quantile over the draws; null: never reached") for name in QUANTILES}
    nominal = said(MAYBE, "with every input at its median")
    return table(description, {"unit": unit(*units), **numbers, "nominal": nominal, "error": ERRORS})


def required_time(description: str, clock: str) -> Schema:
    """A required time."""
    schema = quantiles(description, "s")
    schema["properties"] |= {
        "clock": {"const": clock},
        "reachable": said(PROBABILITY, "probability that the goal can ever be reached"),
        "in_time": said(PROBABILITY, "probability that the required time is within the budget"),
        "per_calculation": mapping(MAYBE, "median if only that calculation is right"),
    }
    schema["required"] = list(schema["properties"])
    return schema


def level(description: str, *units: str) -> Schema:
    """Median over the draws and nominal value."""
    numbers = {"q50": MAYBE, "nominal": MAYBE}
    return table(description, {"unit": unit(*units), **numbers} if units else numbers)


def chance() -> Schema:
    """The chance and everything around it."""
    at = table("chance at one of the times asked for", {"within": MOMENT, "value": PROBABILITY, "error": NUMBER})
    return table(
        "probability of meeting the goal, averaged over the inputs",
        {
            "within": said(MOMENT, "the budget"),
            "value": said(PROBABILITY, "chance within the budget"),
            "error": said(NUMBER, "95 % half-width of the numerical integration"),
            "ceiling": said(PROBABILITY, "chance for unlimited wall time, the sample supply still counting"),
            "nominal": said(PROBABILITY, "with every input at its median"),
            "goal_met": said({"type": ["boolean", "null"]}, "chance at least the power; null where none was asked"),
            "per_calculation": mapping(PROBABILITY, "chance if only that calculation is right"),
            "at_each": listed(at, "chance at each time of a list of budgets"),
        },
    )


def sigma() -> Schema:
    """sigma in parts."""
    part = level("median and nominal value, in the unit of sigma")
    return table(
        "standard uncertainty of the splitting seen at the budget",
        {
            "at": MOMENT,
            "unit": unit("Hz", "1"),
            "total": part,
            "statistical": part,
            "reference": part,
            "systematic": part,
            "shares": mapping(PROBABILITY, "nominal parts of sigma squared"),
        },
    )


def contract() -> Schema:
    """The decision contract."""
    count = {"type": "integer", "minimum": 1}
    return table(
        "what the word chance rests on",
        {
            "null": TEXT,
            "threshold": said(MAYBE, "sigma, as asked"),
            "threshold_used": said(MAYBE, "sigma, raised for trials and looks"),
            "p": said(MAYBE, "false-claim probability of the threshold"),
            "sides": count,
            "trials": count,
            "looks": count,
            "power": MAYBE,
            "confidence": MAYBE,
            "construction": {"type": ["string", "null"]},
            "drawn": TEXT,
            "unknown_after": TEXT,
            "floor_declared": {"type": "boolean"},
            "schedule_declared": {"type": "boolean"},
        },
    )


def significance() -> Schema:
    """|splitting seen| over sigma."""
    numbers = dict.fromkeys(("q16", "q50", "q84", "nominal"), MAYBE)
    left = said(MAYBE, "what not knowing the systematics well leaves, sigma")
    return table("splitting seen over sigma at the budget, sigma", {"at": MOMENT, **numbers, "surviving": left})


def resolution() -> Schema:
    """What must be resolved."""
    return table(
        "sigma that the goal needs",
        {
            "needed": level("sigma of the splitting", "Hz"),
            "needed_centre": level("sigma of one line centre", "Hz"),
            "of_frequency": nullable(level("needed sigma of the splitting over the line's frequency")),
            "of_fwhm": nullable(level("needed sigma of the splitting over the interrogation width")),
        },
    )


def scenario() -> Schema:
    """Everything about one scenario."""
    limit = table(
        "median planned limit on |splitting| if there is no splitting",
        {"unit": unit("Hz"), "confidence": PROBABILITY, "construction": TEXT, "q50": MAYBE},
    )
    linear = table(
        "the linear law of propagation on ln t",
        {
            "required_time": table("value, and u(ln t)", {"unit": unit("s"), "value": MAYBE, "u_ln": MAYBE}),
            "adequate": {"type": ["boolean", "null"]},
        },
    )  # fmt: skip
    limiting = table(
        "which class of uncertainty limits at the budget",
        {
            "name": {"enum": ["statistics", "reference", "systematics", "supply"]},
            "shares": mapping(PROBABILITY, "shares of the draws"),
        },
    )
    return table(
        "one scenario",
        {
            "name": TEXT,
            "technique": TEXT,
            "splitting": quantiles("true splitting, signed", "Hz"),
            "signal": quantiles("splitting seen, on the technique's scale", "Hz", "1"),
            "centre_uncertainty": nullable(quantiles("line centre of one enantiomer after one cycle", "Hz")),
            "sensitivity": nullable(quantiles("sigma times the root of live time, no systematics", "Hz s^0.5")),
            "required_time": required_time("time after which the goal is met", "wall"),
            "required_live_time": required_time("the same in live time", "live"),
            "chance": chance(),
            "significance": nullable(significance()),
            "sigma": sigma(),
            "resolution": nullable(resolution()),
            "reach": quantiles("smallest true splitting that meets the goal within the budget", "Hz"),
            "limit": nullable(limit),
            "linear": linear,
            "contract": contract(),
            "limiting": limiting,
            "status": {"enum": ["reachable", "unreachable"]},
            "reason": TEXT,
            "not_applicable": listed(TEXT, "what the technique does not have"),
        },
    )


def assess_schema() -> Schema:
    """The answer of assess."""
    warning = table("a doubt", {"code": TEXT, "address": TEXT, "message": TEXT})
    question = {
        "description": "the question and the options that change numbers",
        "type": "object",
        "properties": {"name": TEXT},
        "required": ["name"],
    }
    schema = table(
        "the answer of pvfeas assess",
        {
            "schema_version": {"const": SCHEMA_VERSION},
            "pvfeas": said(TEXT, "version"),
            "question": question,
            "study": table("the study", {"title": TEXT, "sha256": {"type": "string", "pattern": "^[0-9a-f]{64}$"}}),
            "seed": {"type": "integer"},
            "points": said({"type": "integer"}, "points of the largest sample used"),
            "method": {"enum": ["lattice", "monte-carlo"]},
            "tolerance_met": {"type": "boolean"},
            "warnings": listed(warning, "doubts that travel with the answer"),
            "scenarios": listed(scenario(), "one entry a scenario, in the order asked for"),
        },
    )
    return {"$schema": DIALECT, "title": "pvfeas assess", **schema}


def compare_schema() -> Schema:
    """The answer of compare: that of assess, what differs, and the odds."""
    schema = assess_schema()
    difference = table("one thing written differently", {"key": TEXT, "texts": mapping(TEXT, "text per scenario")})
    odds = table(
        "which of two scenarios needs less wall time",
        {
            "first": TEXT,
            "second": TEXT,
            "first_sooner": PROBABILITY,
            "second_sooner": PROBABILITY,
            "neither": said(PROBABILITY, "both unreachable"),
            "error": NUMBER,
            "nominal_ratio": said(MAYBE, "required time of the second over that of the first, nominal"),
        },
    )
    schema["title"], schema["description"] = "pvfeas compare", "the answer of pvfeas compare"
    schema["properties"] |= {
        "differences": listed(difference, "what the scenarios do not share"),
        "odds": listed(odds, "every pair"),
    }
    schema["required"] += ["differences", "odds"]
    return schema


FILES = {"assess.schema.json": assess_schema, "compare.schema.json": compare_schema}


def answer_schema_text(name: str) -> str:
    """The schema as the file holds it."""
    return json.dumps(FILES[name](), indent=2, ensure_ascii=False) + "\n"


def write_answer_schemas(folder: Path) -> None:
    """Write both files into a folder."""
    for name in FILES:
        (folder / name).write_text(answer_schema_text(name), encoding="utf-8")
