"""A quantity written as a table: value with source and status, percentiles, products, scales, ensembles."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import mpmath
import numpy as np
from scipy import special

from pvfeas.errors import QuantityError
from pvfeas.laws import Exact, Law, Lognormal, Normal
from pvfeas.quantity import LEAST, MOST, SINGLE, Canonical, Quantity, Scale, parse
from pvfeas.suggestions import did_you_mean
from pvfeas.units import TABLES, dimension_of, tidy

STATUSES = ("measured", "demonstrated", "extrapolated", "assumed")
PERCENTILES = {
    "p025": 0.025,
    "p05": 0.05,
    "p10": 0.10,
    "p16": 0.16,
    "p84": 0.84,
    "p90": 0.90,
    "p95": 0.95,
    "p975": 0.975,
}
PAIRS = (("p05", "p95"), ("p16", "p84"), ("p10", "p90"), ("p025", "p975"))
TEXTS = ("source", "note", "status", "group")
KEYS = (
    "value", "unit", "source", "note", "status", "demonstrated", "law", "times", "scale", "values", "weights", "group",
    "discrepancy", "relative", "difference", *PERCENTILES,
)  # fmt: skip
MOST_MEMBERS = 100


def inside(key: str, error: QuantityError) -> QuantityError:
    """The same error, said to be about one key of the table."""
    return QuantityError(error.found, error.wanted, f"{key}.{error.key}" if error.key else key)


def parse_table(table: dict[str, Any], canonical: Canonical, splitting: bool = False) -> Quantity:
    """Read the table form. QuantityError names the key that is wrong."""
    allowed = (*KEYS, "of") if splitting else KEYS
    for key in table:
        if key not in allowed:
            raise QuantityError(
                f"the key {key!r} is not known here",
                did_you_mean(key, allowed) or f"known keys are {', '.join(allowed)}",
                key,
            )
    _texts(table)
    relative = _flag(table)
    if relative and not splitting:
        raise QuantityError(
            "relative on what is no splitting", "drop it: only a splitting is a fraction of the frequency", "relative"
        )
    inner = Canonical("*") if "times" in table else Canonical("1") if relative else canonical
    starts = [k for k in ("value", "values", "difference") if k in table] + [k for k in table if k in PERCENTILES][:1]
    if len(starts) != 1:
        found = "no value" if not starts else f"both {starts[0]} and {starts[1]}"
        raise QuantityError(found, "exactly one of value, values, difference or a pair such as p05 and p95 is needed")
    base = _base(table, inner, starts[0])
    times = tuple(_list(table, "times", lambda one: parse(one, "*")))
    scale = tuple(_list(table, "scale", _scale))
    return Quantity(
        written=table, law=base.law, reference=base.reference, along_line=base.along_line, relative=relative,
        times=base.times + times, scale=base.scale + scale, members=base.members, weights=base.weights,
        group=table.get("group", ""), discrepancy=_one(table, "discrepancy", "1"),
        source=table.get("source", ""), note=table.get("note", ""), status=table.get("status", ""),
        demonstrated=_demonstrated(table, inner), extra=(("of", table["of"]),) if "of" in table else (),
        dimension=base.dimension,
    )  # fmt: skip


def _texts(table: dict[str, Any]) -> None:
    for key in TEXTS:
        if key in table and not isinstance(table[key], str):
            raise QuantityError(f"{_short(table[key])} is no text", "a text in quotes is needed", key)
    status = table.get("status")
    if status is not None and status not in STATUSES:
        raise QuantityError(
            f"{status!r} is no status",
            did_you_mean(status, STATUSES) or f"one of {', '.join(STATUSES)} is needed",
            "status",
        )
    if "group" in table and "values" not in table:
        raise QuantityError("group without values", "group ties ensembles: give values = {…}")
    for key, partner in (("weights", "values"), ("discrepancy", "values")):
        if key in table and partner not in table:
            raise QuantityError(f"{key} without {partner}", f"{key} belongs to {partner}")
    if "law" in table and not any(key in PERCENTILES for key in table):
        raise QuantityError("law without percentiles", "law belongs to a pair such as p05 and p95: drop it", "law")
    if "unit" in table and "difference" in table:
        raise QuantityError("unit beside difference", "write each of the two values with its own unit", "unit")


def _flag(table: dict[str, Any]) -> bool:
    relative = table.get("relative", False)
    if not isinstance(relative, bool):
        raise QuantityError(_short(relative), "true or false is needed", "relative")
    return relative


def _base(table: dict[str, Any], canonical: Canonical, start: str) -> Quantity:
    if start == "values":
        return _ensemble(table, canonical)
    if start == "difference":
        return _difference(table, canonical)
    if start in PERCENTILES:
        return _percentiles(table, canonical)
    return _value(table["value"], table, canonical, "value")


def _value(written: Any, table: dict[str, Any], canonical: Canonical, key: str) -> Quantity:
    """A text or number, with the table's unit behind it where it has one."""
    unit = table.get("unit")
    if unit is not None and not isinstance(unit, str):
        raise QuantityError(f"{_short(unit)} is no unit", "a text in quotes is needed", "unit")
    if isinstance(written, dict):
        raise QuantityError("a table", "a text or a number is needed", key)
    try:
        return parse(written, canonical.unit, canonical.along_line, behind=unit or "")
    except QuantityError as error:
        raise inside(key, error) from None


def _one(table: dict[str, Any], key: str, unit: str) -> Quantity | None:
    if key not in table:
        return None
    try:
        return parse(table[key], unit)
    except QuantityError as error:
        raise inside(key, error) from None


def _demonstrated(table: dict[str, Any], canonical: Canonical) -> Quantity | None:
    if "demonstrated" not in table:
        return None
    return _value(table["demonstrated"], table, canonical, "demonstrated")


def _list(table: dict[str, Any], key: str, read: Any) -> list[Any]:
    entries = table.get(key, [])
    if not isinstance(entries, list):
        raise QuantityError(f"{_short(entries)} where a list belongs", f"a list is needed: {key} = [ … ]", key)
    found = []
    for place, entry in enumerate(entries):
        try:
            found.append(read(entry))
        except QuantityError as error:
            raise inside(f"{key}[{place}]", error) from None
    return found


def _scale(entry: Any) -> Scale:
    parts = {"with": "*", "from": "*", "exponent": "1"}
    if not isinstance(entry, dict) or set(entry) != set(parts):
        given = ", ".join(entry) if isinstance(entry, dict) else _short(entry)
        raise QuantityError(
            f"a scale of {given or 'nothing'}", 'a table {with = "@…", from = "…", exponent = "…"} is needed'
        )
    found = {}
    for name, unit in parts.items():
        try:
            found[name] = parse(entry[name], unit)
        except QuantityError as error:
            raise inside(name, error) from None
        law = found[name].law
        if name != "exponent" and isinstance(law, Exact) and law.value <= 0.0:
            raise QuantityError(f"{_short(entry[name])} is not positive", "a scale compares positive quantities", name)
    return Scale(found["with"], found["from"], found["exponent"])


def _short(value: Any) -> str:
    """A value as it was written, tables and lists by name."""
    if isinstance(value, dict | list):
        return "a table" if isinstance(value, dict) else "a list"
    return str(value).lower() if isinstance(value, bool) else f'"{value}"' if isinstance(value, str) else str(value)


def _percentiles(table: dict[str, Any], canonical: Canonical) -> Quantity:
    """A pair of percentiles of equal tails: lognormal where both are positive, unless law says normal."""
    given = {key for key in table if key in PERCENTILES}
    pair = next((pair for pair in PAIRS if set(pair) == given), None)
    if pair is None:
        raise QuantityError(
            f"the percentiles {', '.join(sorted(given))}", "a pair is needed: p05 and p95, p16 and p84, …"
        )
    ends, read = [], [_value(table[key], table, canonical, key) for key in pair]
    for key, end in zip(pair, read, strict=True):
        if not isinstance(end.law, Exact):
            raise QuantityError(
                f"{_short(table[key])} is not exact", "an exact value is needed in a pair of percentiles", key
            )
        ends.append(end.law.value)
    _of_one_kind(read, pair[1])
    name = table.get("law", "lognormal" if ends[0] > 0 else "normal")
    if name not in ("normal", "lognormal"):
        raise QuantityError(f"{_short(name)} is no law here", "normal or lognormal is needed", "law")
    if ends[0] >= ends[1]:
        raise QuantityError(f"{pair[0]} is not below {pair[1]}", "the percentiles must rise")
    law = _between(name, ends, float(special.ndtri(PERCENTILES[pair[1]])))
    return Quantity(table, law=law, along_line=read[0].along_line, dimension=read[0].dimension)


def _of_one_kind(read: Sequence[Quantity], key: str) -> None:
    if len({(one.along_line, one.dimension) for one in read}) > 1:
        raise QuantityError("units of different kinds", "all values of one quantity need units of one kind", key)


def _between(name: str, ends: list[float], z: float) -> Law:
    low, high = ends
    if name == "normal":
        return Normal((low + high) / 2.0, (high - low) / (2.0 * z))
    if low <= 0.0:
        raise QuantityError("a percentile that is not positive", 'a lognormal law is positive: write law = "normal"')
    return Lognormal(float(np.sqrt(low * high)), float((high / low) ** (1.0 / (2.0 * z))))


def _ensemble(table: dict[str, Any], canonical: Canonical) -> Quantity:
    values = table["values"]
    if not isinstance(values, dict) or not values:
        found = "an empty table" if values == {} else f"{_short(values)} where a table by name belongs"
        raise QuantityError(
            found, 'a table of calculations by name is needed: values = {HF = "…", B3LYP = "…"}', "values"
        )
    if len(values) > MOST_MEMBERS:
        raise QuantityError(f"{len(values)} members", f"at most {MOST_MEMBERS} are enumerated", "values")
    members = tuple((name, _value(one, table, canonical, f"values.{name}")) for name, one in values.items())
    for name, member in members:
        if member.law is None:
            raise QuantityError("a reference", "members are written out", f"values.{name}")
    _of_one_kind([member for _, member in members], "values")
    weights = table.get("weights", {})
    if isinstance(weights, list) and len(weights) == len(members):
        weights = dict(zip(values, weights, strict=True))
    if not isinstance(weights, dict) or (weights and set(weights) != set(values)):
        found = (
            f"{len(weights)} weights for {len(values)} members"
            if isinstance(weights, dict | list)
            else f"{_short(weights)} where a list belongs"
        )
        raise QuantityError(found, "one weight for each member is needed, in order or by name", "weights")
    numbers = [weights.get(name, 1.0) for name in values]
    for weight in numbers:
        if isinstance(weight, bool) or not isinstance(weight, int | float) or not 0 < weight < 1e12:
            raise QuantityError(
                f"the weight {_short(weight)} is not a positive number",
                "weights are positive; they need not add to 1",
                "weights",
            )
    total = float(sum(numbers))
    first = members[0][1]
    return Quantity(
        table, members=members, weights=tuple(float(w) / total for w in numbers), along_line=first.along_line,
        dimension=first.dimension,
    )  # fmt: skip


def _difference(table: dict[str, Any], canonical: Canonical) -> Quantity:
    """Two absolute values subtracted at full precision (mpmath), in the canonical unit."""
    pair = table["difference"]
    if not isinstance(pair, list) or len(pair) != 2 or not all(isinstance(one, str) for one in pair):
        raise QuantityError(
            "not two texts", 'two absolute values are needed: difference = ["… cm^-1", "… cm^-1"]', "difference"
        )
    if canonical.unit not in TABLES:
        raise QuantityError("difference of a compound unit", "only frequencies and energies are subtracted")
    value = exact_difference(pair[0], pair[1], canonical.unit)
    if value != 0.0 and not LEAST <= abs(value) <= MOST:
        raise QuantityError(f"a difference of {value:g}", "a number between 1e-300 and 1e300 is needed", "difference")
    return Quantity(table, law=Exact(value), dimension=dimension_of(canonical.unit))


def exact_difference(first: str, second: str, canonical: str) -> float:
    """first − second in the canonical unit at 60 digits, rounded once at the end."""
    with mpmath.workdps(60):
        return float(_exact(first, canonical) - _exact(second, canonical))


def _exact(text: str, canonical: str) -> Any:
    match = SINGLE.fullmatch(tidy(text))
    if match is None:
        raise QuantityError(f'"{text}" cannot be read', "an exact number with its unit is needed", "difference")
    factor = TABLES[canonical].get(match["unit"])
    if factor is None:
        raise QuantityError(f"the unit {match['unit']!r}", "a frequency or an energy is needed", "difference")
    return mpmath.mpf(match["value"]) * mpmath.mpf(str(factor))
