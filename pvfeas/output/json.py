"""Results as JSON of schema version "1": nine significant digits, never NaN or Infinity."""

from __future__ import annotations

import json
import math
from collections.abc import Mapping
from dataclasses import fields, is_dataclass
from typing import Any

from pvfeas.output.provenance import version
from pvfeas.output.words import escaped
from pvfeas.results import (
    SCHEMA_VERSION,
    Assessment,
    Comparison,
    Level,
    Limit,
    LinearTime,
    RequiredTime,
    Resolution,
    ScenarioResult,
)

DIGITS = 9


def plain(value: Any) -> Any:
    """Dataclasses, tuples and numbers as JSON knows them; infinity becomes null.

    Raises ValueError for NaN: no result may hold one.
    """
    if is_dataclass(value) and not isinstance(value, type):
        return {field.name: plain(getattr(value, field.name)) for field in fields(value)}
    if isinstance(value, Mapping):
        return {str(key): plain(inner) for key, inner in value.items()}
    if isinstance(value, list | tuple):
        return [plain(inner) for inner in value]
    if isinstance(value, bool) or value is None or isinstance(value, str | int):
        return value
    return rounded(float(value))


def rounded(number: float) -> float | None:
    """A number to nine significant digits; None for infinity. ValueError for NaN."""
    if math.isnan(number):
        raise ValueError("a result holds NaN")
    return float(f"{number:.{DIGITS - 1}e}") if math.isfinite(number) else None


def _unit_first(unit: str, value: Any) -> dict[str, Any]:
    return {"unit": unit, **{name: inner for name, inner in plain(value).items() if name != "unit"}}


def _times(found: RequiredTime) -> dict[str, Any]:
    return _unit_first(found.unit, found)


def _level(level: Level | None, unit: str | None = None) -> dict[str, Any] | None:
    if level is None:
        return None
    return dict(plain(level)) if unit is None else _unit_first(unit, level)


def _resolution(found: Resolution | None) -> dict[str, Any] | None:
    if found is None:
        return None
    return {
        "needed": _level(found.needed, found.unit),
        "needed_centre": _level(found.needed_centre, found.unit),
        "of_frequency": _level(found.of_frequency),
        "of_fwhm": _level(found.of_fwhm),
    }


def _limit(found: Limit | None) -> dict[str, Any] | None:
    return None if found is None else _unit_first(found.unit, found)


def _linear(found: LinearTime) -> dict[str, Any]:
    return {
        "required_time": {"unit": "s", "value": plain(found.value), "u_ln": plain(found.u_ln)},
        "adequate": found.adequate,
    }


def scenario_content(result: ScenarioResult) -> dict[str, Any]:
    """One scenario as the schema has it."""
    content = dict(plain(result))
    content["chance"]["at_each"] = [
        {"within": plain(within), "value": plain(value), "error": plain(error)}
        for within, value, error in result.chance.at_each
    ]
    return content | {
        "required_time": _times(result.required_time),
        "required_live_time": _times(result.required_live_time),
        "resolution": _resolution(result.resolution),
        "limit": _limit(result.limit),
        "linear": _linear(result.linear),
    }


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
    names = [one.name for one in result.assessment.scenarios]
    content["differences"] = [
        {"key": one.key, "texts": dict(zip(names, one.texts, strict=True))} for one in result.differences
    ]
    content["odds"] = plain(result.odds)
    return content


def to_json(content: Mapping[str, Any]) -> str:
    """The text of a JSON document, control characters escaped; ValueError if something is not finite after all."""
    return escaped(json.dumps(content, indent=1, ensure_ascii=False, allow_nan=False), "utf-8", "json") + "\n"
