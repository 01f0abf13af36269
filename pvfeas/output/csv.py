"""Results as tidy CSV: units in the header, one row a scenario or a point."""

from __future__ import annotations

import csv
import io
from collections.abc import Iterable, Sequence
from typing import Any

from pvfeas.results import Assessment, Curves, Quantiles, RequiredTime, ScenarioResult

NAMES = ("q05", "q16", "q50", "q84", "q95", "nominal")


def _row(result: ScenarioResult) -> dict[str, Any]:
    row: dict[str, Any] = {"scenario": result.name, "technique": result.technique, "status": result.status}
    for name, found in (
        ("splitting", result.splitting), ("signal", result.signal), ("required_time", result.required_time),
        ("required_live_time", result.required_live_time), ("reach", result.reach),
        ("centre_uncertainty", result.centre_uncertainty), ("sensitivity", result.sensitivity),
    ):  # fmt: skip
        row |= _quantiles(name, found)
    row |= {
        "reachable": result.required_time.reachable, "in_time": result.required_time.in_time,
        "within (s)": result.chance.within.value, "chance": result.chance.value, "chance_error": result.chance.error,
        "chance_ceiling": result.chance.ceiling,
        "significance_q50": None if result.significance is None else result.significance.q50,
        "sigma_q50 (Hz)": result.sigma.total.q50,
        "needed_sigma_q50 (Hz)": None if result.resolution is None else result.resolution.needed.q50,
        "limit_q50 (Hz)": None if result.limit is None else result.limit.q50,
        "limiting": result.limiting.name, "reason": result.reason,
    }  # fmt: skip
    return row


def _quantiles(name: str, found: Quantiles | RequiredTime | None) -> dict[str, Any]:
    unit = "Hz" if found is None else found.unit
    return {f"{name}_{one} ({unit})": None if found is None else getattr(found, one) for one in NAMES}


def assessment_csv(result: Assessment) -> str:
    """One row a scenario."""
    return to_csv([_row(one) for one in result.scenarios])


def to_csv(rows: Sequence[dict[str, Any]]) -> str:
    """Rows of equal keys as CSV; an empty cell is what JSON calls null."""
    stream = io.StringIO()
    writer = csv.DictWriter(stream, list(rows[0]), lineterminator="\n")
    writer.writeheader()
    writer.writerows({key: _cell(value) for key, value in row.items()} for row in rows)
    return stream.getvalue()


def _cell(value: Any) -> Any:
    if value is None:
        return ""
    return f"{value:.9g}" if isinstance(value, float) else value


def curves_csv(curves: Curves) -> str:
    """The numbers of the figures, one row a point of a curve."""
    return to_csv(list(_points(curves)))


def _points(curves: Curves) -> Iterable[dict[str, Any]]:
    for one in curves.sigma:
        named = {"sigma": one.total, "sigma q16": one.total_q16, "sigma q84": one.total_q84}
        for name, values in {**named, **{f"part {key}": part for key, part in one.parts.items()}}.items():
            for wall, value in zip(one.wall_time, values, strict=True):
                yield {"scenario": one.scenario, "curve": name, "wall_time (s)": wall, "value": value, "unit": one.unit}
    for chance in curves.chance:
        for wall, value in zip(chance.wall_time, chance.chance, strict=True):
            yield {"scenario": chance.scenario, "curve": "chance", "wall_time (s)": wall, "value": value, "unit": "1"}
