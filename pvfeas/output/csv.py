"""Results as tidy CSV: units in the header, one row a scenario or a point of a curve."""

from __future__ import annotations

import csv
import io
from collections.abc import Iterator, Mapping, Sequence
from typing import Any

from pvfeas.output.json import plain, scenario_content
from pvfeas.output.provenance import columns
from pvfeas.output.words import spelt_out
from pvfeas.results import Assessment, ChanceCurve, Curves, SigmaCurve

PURE = ("reachable", "in_time", "shares", "u_ln", "confidence")  # numbers without a unit beside numbers with one
NAMED = ("per_calculation", "shares")  # tables whose keys are names that somebody chose
Row = Mapping[str, Any]


def assessment_csv(result: Assessment) -> str:
    """One row a scenario; columns are the addresses of the JSON, with their units."""
    rows = [_row(scenario_content(one)) for one in result.scenarios]
    return to_csv(rows, columns(result.question, result.sha256))


def _row(content: Mapping[str, Any]) -> dict[str, Any]:
    rest = {key: value for key, value in content.items() if key != "name"}
    return {"scenario": content["name"], **dict(_flat(rest, "", ""))}


def _flat(content: Mapping[str, Any], path: str, unit: str) -> Iterator[tuple[str, Any]]:
    """Every value with its address; a table's unit holds for the numbers below it."""
    unit = str(content.get("unit", unit))
    for key, value in content.items():
        address = f"{path}.{key}" if path else key
        if key in NAMED:
            told = f" ({unit})" if unit not in ("", "1") and key not in PURE else ""
            yield from ((f"{address}.{name}{told}", number) for name, number in value.items())
        elif isinstance(value, Mapping):
            yield from _flat(value, address, "" if key in PURE else unit)
        elif key == "unit":
            continue
        elif isinstance(value, list):
            yield from _listed(address, value)
        else:
            written = f"{address} ({unit})" if unit not in ("", "1") and _has_unit(key, value) else address
            yield written, value


def _listed(address: str, values: Sequence[Any]) -> Iterator[tuple[str, Any]]:
    if all(isinstance(one, str) for one in values):
        yield address, "; ".join(values)
        return
    for place, one in enumerate(values, start=1):
        yield from _flat(one, f"{address}.{place}", "")


def _has_unit(key: str, value: Any) -> bool:
    return key not in PURE and not isinstance(value, str | bool)


def curves_csv(curves: Curves, question: Mapping[str, Any], sha256: str) -> str:
    """The numbers of the figures, one row a point of a curve or a mark."""
    rows = [row for one in curves.sigma for row in _sigma_rows(one)]
    rows += [row for one in curves.chance for row in _chance_rows(one)]
    return to_csv(rows, columns(question, sha256))


def _point(
    scenario: str, curve: str, wall: float | None, value: float | None, unit: str, error: float | None = None
) -> Row:
    return {"scenario": scenario, "curve": curve, "wall_time (s)": wall, "value": value, "unit": unit, "error": error}


def _sigma_rows(one: SigmaCurve) -> Iterator[Row]:
    named = {"sigma": one.total, "sigma q16": one.total_q16, "sigma q84": one.total_q84}
    for name, values in {**named, **{f"part {key}": part for key, part in one.parts.items()}}.items():
        for wall, value in zip(one.wall_time, values, strict=True):
            yield _point(one.scenario, name, wall, value, one.unit)
    levels = {
        "floor": one.floor, "needed sigma q16": one.needed_q16, "needed sigma q50": one.needed_q50,
        "needed sigma q84": one.needed_q84, "needed sigma nominal": one.needed_nominal,
    }  # fmt: skip
    for name, level in levels.items():
        yield _point(one.scenario, name, None, level, one.unit)
    for name, wall_mark in {
        "required time, nominal": one.crossing,
        "first time": one.first,
        "sample used up": one.last,
    }.items():
        yield _point(one.scenario, name, wall_mark, None, one.unit)


def _chance_rows(one: ChanceCurve) -> Iterator[Row]:
    for wall, value, error in zip(one.wall_time, one.chance, one.error, strict=True):
        yield _point(one.scenario, "chance", wall, value, "1", error)
    yield _point(one.scenario, "chance at budget", one.budget, one.at_budget, "1")
    yield _point(one.scenario, "ceiling of the chance", None, one.ceiling, "1")


def to_csv(rows: Sequence[Row], told: Mapping[str, str] | None = None) -> str:
    """Rows as CSV, with columns that are alike in every row at the end.

    An empty cell is what JSON calls null, or what a row does not have.
    """
    alike = dict(told or {})
    names = list(dict.fromkeys(key for row in rows for key in row))
    stream = io.StringIO()
    writer = csv.writer(stream, lineterminator="\n")
    writer.writerow([spelt_out(name) for name in (*names, *alike)])
    for row in rows:
        whole = {**row, **alike}
        writer.writerow([_cell(whole.get(name)) for name in (*names, *alike)])
    return stream.getvalue()


def _cell(value: Any) -> Any:
    value = plain(value)
    if value is None:
        return ""
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, str):
        return spelt_out(value)
    return f"{value:.9g}" if isinstance(value, float) else value
