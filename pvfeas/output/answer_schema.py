"""JSON Schema of what assess and compare answer as JSON."""

from __future__ import annotations

import json
from collections.abc import Collection, Mapping
from pathlib import Path
from typing import Any

from pvfeas.results import SCHEMA_VERSION

Schema = dict[str, Any]
DIALECT = "https://json-schema.org/draft/2020-12/schema"
QUANTILES = ("q05", "q16", "q50", "q84", "q95")
CLASSES = ("statistics", "reference", "systematics", "supply")
PER_CALCULATION = "if only that calculation is right; none where there are no rival calculations"


def text(description: str, **more: Any) -> Schema:
    """A text."""
    return {"description": description, "type": "string", **more}


def number(description: str, **more: Any) -> Schema:
    """A number that is always there."""
    return {"description": description, "type": "number", **more}


def maybe(description: str) -> Schema:
    """A number, or null."""
    return {"description": description, "type": ["number", "null"]}


def positive(description: str) -> Schema:
    """A number that cannot be negative."""
    return number(description, minimum=0)


def probability(description: str) -> Schema:
    """A probability or a share."""
    return number(description, minimum=0, maximum=1)


def count(description: str, least: int = 1) -> Schema:
    """A whole number."""
    return {"description": description, "type": "integer", "minimum": least}


def truth(description: str) -> Schema:
    """Yes or no."""
    return {"description": description, "type": "boolean"}


def table(description: str, properties: Mapping[str, Schema], optional: Collection[str] = ()) -> Schema:
    """An object with these keys and no others, all required but the optional ones."""
    return {
        "description": description,
        "type": "object",
        "properties": dict(properties),
        "required": [name for name in properties if name not in optional],
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
    return {"description": f"unit of the numbers beside it: {' or '.join(units)}", "enum": list(units)}


def clock(name: str) -> Schema:
    """Which clock a time is read from."""
    meaning = {"wall": "calendar time", "live": "whole cycles on either enantiomer"}[name]
    return {"description": f"the clock of this time: {meaning}", "const": name}


def moment(description: str) -> Schema:
    """A wall time."""
    return table(description, {"value": positive("the time, s"), "unit": unit("s"), "clock": clock("wall")})


def errors(unit_name: str, null: bool, more: Mapping[str, Schema] | None = None) -> Schema:
    """95 % half-widths; a quantile that is null has none. null: the replicates may disagree on whether it is finite."""
    make = maybe if null else positive
    unknown = "; null: not known, infinite in some replicates" if null else ""
    named = {name: make(f"of the {name[1:]} % quantile, {unit_name}{unknown}") for name in QUANTILES}
    told = "95 % half-widths of the numerical integration; absent for a quantile that is null"
    return table(told, {**named, **(more or {})}, QUANTILES if null else ())


def quantiles(description: str, *units: str, null: str = "") -> Schema:
    """The distribution of a quantity over the draws. null: what a null means, where it can occur."""
    named, end = " or ".join(units), f"; null: {null}" if null else ""
    make = maybe if null else number
    return table(
        description,
        {
            "unit": unit(*units),
            **{name: make(f"{int(name[1:])} % quantile over the draws, {named}{end}") for name in QUANTILES},
            "nominal": make(f"value with every input at its median, {named}{end}"),
            "error": errors(named, bool(null)),
        },
    )


def required_time(description: str, name: str) -> Schema:
    """A required time."""
    schema = quantiles(description, "s", null="never")
    half_width = "95 % half-width of that probability"
    schema["properties"] |= {
        "clock": clock(name),
        "error": errors("s", True, {"reachable": positive(half_width), "in_time": positive(half_width)}),
        "reachable": probability("probability that the goal can ever be reached"),
        "in_time": probability("probability that the required time is within the budget"),
        "per_calculation": mapping(maybe("median, s; null: never"), f"median required time, s, {PER_CALCULATION}"),
    }
    if name == "live":
        schema["properties"]["per_calculation"] = table("empty: medians are given in wall time only", {})
    schema["required"] = list(schema["properties"])
    return schema


def level(description: str, unit_name: str, stated: bool = False) -> Schema:
    """Median over the draws and nominal value. stated: with the unit beside them."""
    numbers = {
        "q50": positive(f"median over the draws, {unit_name}"),
        "nominal": positive(f"value with every input at its median, {unit_name}"),
    }
    return table(description, {"unit": unit(unit_name), **numbers} if stated else numbers)


def chance() -> Schema:
    """The chance and everything around it."""
    error = positive("95 % half-width of the numerical integration of the chance")
    at = table(
        "chance at one of the times asked for",
        {"within": moment("the time asked for"), "value": probability("chance within that time"), "error": error},
    )
    return table(
        "probability of meeting the goal, averaged over the inputs",
        {
            "within": moment("the budget, the longest of the times asked for"),
            "value": probability("chance within the budget"),
            "error": error,
            "ceiling": probability("chance for unlimited wall time, the sample supply still counting"),
            "nominal": probability("chance with every input at its median"),
            "goal_met": {
                "description": "whether the chance is at least the power; null where no power was asked",
                "type": ["boolean", "null"],
            },
            "per_calculation": mapping(probability("chance within the budget"), f"chance {PER_CALCULATION}"),
            "at_each": listed(at, "chance at each time of a list of budgets; empty for a single budget"),
        },
    )


def sigma() -> Schema:
    """sigma in parts."""
    own = "in the unit of sigma"
    return table(
        "standard uncertainty of the splitting seen at the budget",
        {
            "at": moment("the budget"),
            "unit": unit("Hz", "1"),
            "total": level("sigma", own),
            "statistical": level("the part of counting noise", own),
            "reference": level("the part of the frequency noise of the probe", own),
            "systematic": level("the part of all systematics", own),
            "shares": mapping(probability("share of sigma squared"), "nominal shares of sigma squared, summing to 1"),
        },
    )


def contract() -> Schema:
    """The decision contract."""
    claims = "null for goals that claim nothing"
    return table(
        "the decision contract: what the word chance rests on",
        {
            "null": text("the null hypothesis in words"),
            "threshold": maybe(f"significance asked for, sigma; {claims}"),
            "threshold_used": maybe(f"threshold raised for trials and looks, sigma; {claims}"),
            "p": maybe(f"false-claim probability of the threshold asked for; {claims}"),
            "sides": {"description": "sides of the test", "enum": [1, 2]},
            "trials": count("number of independent claims that share the false-claim probability"),
            "looks": count("number of looks at the data"),
            "power": maybe("chance asked for; null where none was"),
            "confidence": maybe("confidence level of the limit asked for; null for goals other than exclude"),
            "construction": {
                "description": "how the limit asked for is constructed; null for goals other than exclude",
                "type": ["string", "null"],
            },
            "drawn": text("what is drawn, in words"),
            "unknown_after": text("what stays unknown after the measurement, in words"),
            "floor_declared": truth("whether any systematic is declared"),
            "schedule_declared": truth("whether a schedule is declared"),
        },
    )


def significance() -> Schema:
    """|splitting seen| over sigma."""
    numbers = {name: positive(f"{int(name[1:])} % quantile over the draws, sigma") for name in ("q16", "q50", "q84")}
    return table(
        "size of the splitting seen over sigma at the budget",
        {
            "at": moment("the budget"),
            **numbers,
            "nominal": positive("value with every input at its median, sigma"),
            "surviving": positive("what not knowing the systematics well leaves of the median, sigma"),
        },
    )


def resolution() -> Schema:
    """What must be resolved."""
    return table(
        "sigma that the goal needs at the budget",
        {
            "needed": level("needed sigma of the splitting seen", "Hz", stated=True),
            "needed_centre": level("needed sigma of one line centre", "Hz", stated=True),
            "of_frequency": nullable(
                level("needed sigma of the splitting over the line's frequency; null where none is given", "no unit")
            ),
            "of_fwhm": nullable(
                level("needed sigma of the splitting over the interrogation FWHM; null where there is none", "no unit")
            ),
        },
    )


def linear() -> Schema:
    """The linear law of propagation."""
    null = "null where the nominal study never meets the goal"
    time = table(
        "required wall time by the linear law",
        {
            "unit": unit("s"),
            "value": maybe(f"required time with every input at its median, s; {null}"),
            "u_ln": maybe(f"standard uncertainty of the natural logarithm of the required time; {null}"),
        },
    )
    adequate = {
        "description": f"whether the linear law agrees with the draws; {null}",
        "type": ["boolean", "null"],
    }
    return table("the linear law of propagation on ln t, for comparison", {"required_time": time, "adequate": adequate})


def scenario() -> Schema:
    """Everything about one scenario."""
    limit = table(
        "median planned limit on the size of the true splitting at the budget if there is no splitting",
        {
            "unit": unit("Hz"),
            "confidence": probability("confidence level of the limit"),
            "construction": text("how the limit is constructed"),
            "q50": maybe("median limit, Hz; null where no measurement is ready within the budget in half of the draws"),
        },
    )
    shares = {name: probability(f"share of the draws limited by {name}") for name in CLASSES}
    limiting = table(
        "which class of uncertainty limits at the budget",
        {
            "name": {"description": "the class that limits most draws", "enum": list(CLASSES)},
            "shares": table("shares of the draws, summing to 1", shares),
        },
    )
    centre = quantiles("uncertainty of the line centre of one enantiomer after one cycle; null: not applicable", "Hz")
    sensitivity = quantiles("sigma times the root of live time, no systematics; null: not applicable", "Hz s^0.5")
    return table(
        "everything about one scenario",
        {
            "name": text("name of the scenario"),
            "technique": text("kind of the technique"),
            "splitting": quantiles("true splitting, signed", "Hz"),
            "signal": quantiles("splitting seen, signed, on the technique's scale", "Hz", "1"),
            "centre_uncertainty": nullable(centre),
            "sensitivity": nullable(sensitivity),
            "required_time": required_time("wall time after which the goal is met", "wall"),
            "required_live_time": required_time("live time after which the goal is met", "live"),
            "chance": chance(),
            "significance": significance(),
            "sigma": sigma(),
            "resolution": resolution(),
            "reach": quantiles(
                "smallest true splitting that meets the goal within the budget", "Hz", null="no splitting does"
            ),
            "limit": limit,
            "linear": linear(),
            "contract": contract(),
            "limiting": limiting,
            "status": {
                "description": "reachable where the median required time is finite",
                "enum": ["reachable", "unreachable"],
            },
            "reason": text("why, in words, with the nearest change that cures an unreachable goal"),
            "not_applicable": listed(text("name of a key that is null"), "what the technique does not have"),
        },
    )


def question(name: str) -> Schema:
    """The question and the options that change numbers."""
    return table(
        "the question and the options that change numbers",
        {
            "name": {"description": "the question", "const": name},
            "scenarios": listed(text("name of a scenario"), "the scenarios asked for, in the order of the answer"),
            "seed": count("seed of the points", 0),
            "tolerance": number("scale of the numerical tolerances", exclusiveMinimum=0),
            "method": {"description": "how inputs are drawn", "enum": ["lattice", "monte-carlo"]},
            "maximum_points": count("most points per replicate"),
        },
    )


def assess_schema() -> Schema:
    """The answer of assess."""
    warning = table(
        "a doubt",
        {
            "code": text("what kind of doubt"),
            "address": text("the input or table it is about; empty where it is about the whole"),
            "message": text("the doubt in words"),
        },
    )
    study = table(
        "the study",
        {
            "title": text("title of the study; empty where it has none"),
            "sha256": text("SHA-256 of the resolved study", pattern="^[0-9a-f]{64}$"),
        },
    )
    schema = table(
        "the answer of pvfeas assess",
        {
            "schema_version": {"description": "version of this schema", "const": SCHEMA_VERSION},
            "pvfeas": text("version of pvfeas"),
            "question": question("assess"),
            "study": study,
            "seed": count("seed of the points", 0),
            "points": count("points of the largest sample used"),
            "method": {"description": "how inputs were drawn", "enum": ["lattice", "monte-carlo"]},
            "tolerance_met": truth("whether every number met its tolerance"),
            "warnings": listed(warning, "doubts that travel with the answer"),
            "scenarios": listed(scenario(), "one entry a scenario, in the order asked for"),
        },
    )
    return {"$schema": DIALECT, "title": "pvfeas assess", **schema}


def compare_schema() -> Schema:
    """The answer of compare: that of assess, what differs, and the odds."""
    schema = assess_schema()
    difference = table(
        "one thing written differently",
        {
            "key": text("address without the scenario"),
            "texts": mapping(text("text as written; - where nothing is"), "text of each scenario"),
        },
    )
    odds = table(
        "which of two scenarios needs less wall time, drawn together",
        {
            "first": text("name of a scenario"),
            "second": text("name of another scenario"),
            "first_sooner": probability("probability that the first needs less wall time"),
            "second_sooner": probability("probability that the second needs less wall time"),
            "neither": probability("probability that both never meet the goal"),
            "error": positive("largest 95 % half-width of the three probabilities"),
            "nominal_ratio": maybe(
                "required time of the second over that of the first, inputs at their medians, no unit; "
                "null where one is infinite"
            ),
        },
    )
    schema["title"], schema["description"] = "pvfeas compare", "the answer of pvfeas compare"
    schema["properties"] |= {
        "question": question("compare"),
        "differences": listed(difference, "what the scenarios write differently"),
        "odds": listed(odds, "every pair of scenarios"),
    }
    schema["required"] += ["differences", "odds"]
    return schema


FILES = {"assess.schema.json": assess_schema, "compare.schema.json": compare_schema}


def answer_schema_text(name: str) -> str:
    """The schema as the file holds it."""
    return json.dumps(FILES[name](), indent=1, ensure_ascii=False, allow_nan=False) + "\n"


def write_answer_schemas(folder: Path) -> None:
    """Write both files into a folder."""
    for name in FILES:
        (folder / name).write_text(answer_schema_text(name), encoding="utf-8", newline="\n")
