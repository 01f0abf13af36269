"""Results as JSON of schema version "1": nine significant digits, never NaN or Infinity."""

from __future__ import annotations

import json
import math
from collections.abc import Mapping
from dataclasses import fields, is_dataclass
from typing import Any

from pvfeas.output.provenance import version
from pvfeas.results import SCHEMA_VERSION, Assessment, Comparison, ScenarioResult

DIGITS = 9


def plain(value: Any) -> Any:
    """Dataclasses, tuples and numbers as JSON knows them; what is not finite becomes null."""
    if is_dataclass(value) and not isinstance(value, type):
        return {field.name: plain(getattr(value, field.name)) for field in fields(value)}
    if isinstance(value, Mapping):
        return {str(key): plain(inner) for key, inner in value.items()}
    if isinstance(value, list | tuple):
        return [plain(inner) for inner in value]
    if isinstance(value, bool) or value is None or isinstance(value, str | int):
        return value
    number = float(value)
    return float(f"{number:.{DIGITS - 1}e}") if math.isfinite(number) else None


def scenario_content(result: ScenarioResult) -> dict[str, Any]:
    """One scenario as the schema has it."""
    content = dict(plain(result))
    for name in ("chance", "required_time", "required_live_time"):
        for extra in ("per_calculation", "at_each"):
            if extra in content[name] and not content[name][extra]:
                del content[name][extra]
    content["chance"]["at_each"] = [
        {"within": within, "value": value, "error": error} for within, value, error in content["chance"].get("at_each", [])
    ]
    if not content["chance"]["at_each"]:
        del content["chance"]["at_each"]
    return content


def assessment_content(result: Assessment) -> dict[str, Any]:
    """The whole answer of assess."""
    return {
        "schema_version": SCHEMA_VERSION,
        "pvfeas": version(),
        "question": plain(result.question),
        "study": {"title": result.title, "sha256": result.sha256},
        "seed": result.seed,
        "points": result.points,
        "method": result.method,
        "tolerance_met": result.tolerance_met,
        "warnings": plain(result.warnings),
        "scenarios": [scenario_content(one) for one in result.scenarios],
    }


def comparison_content(result: Comparison) -> dict[str, Any]:
    """The answer of compare: that of assess, what differs, and the odds."""
    content = assessment_content(result.assessment)
    content["question"]["name"] = "compare"
    names = [one.name for one in result.assessment.scenarios]
    content["differences"] = [
        {"key": one.key, "texts": dict(zip(names, one.texts, strict=True))} for one in result.differences
    ]
    content["odds"] = plain(result.odds)
    return content


def to_json(content: Mapping[str, Any]) -> str:
    """The text of a JSON document; ValueError if something is not finite after all."""
    return json.dumps(content, indent=1, ensure_ascii=False, allow_nan=False) + "\n"
