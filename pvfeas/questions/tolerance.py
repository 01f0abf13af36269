"""Whether every shown number is as well known as it should be."""

from __future__ import annotations

from collections.abc import Iterator

from pvfeas.results import Quantiles, RequiredTime, ScenarioResult

MEDIAN, OTHER, PROBABILITY = 0.002, 0.01, 0.001  # relative, relative, absolute


def unmet(result: ScenarioResult, tolerance: float) -> set[str]:
    """Which parts of the answer hold a number whose 95 % half-width exceeds the tolerance."""
    return {
        name.split(".")[0]
        for name, error, allowed in _checked(result)
        if error is not None and error > allowed * tolerance
    }


def _checked(result: ScenarioResult) -> Iterator[tuple[str, float | None, float]]:
    for name in ("splitting", "signal", "centre_uncertainty", "sensitivity", "reach"):
        found = getattr(result, name)
        if found is not None:
            yield from _quantiles(name, found)
    for name in ("required_time", "required_live_time"):
        times: RequiredTime = getattr(result, name)
        yield from _quantiles(name, times)
        yield f"{name}.reachable", times.error.get("reachable"), PROBABILITY
        yield f"{name}.in_time", times.error.get("in_time"), PROBABILITY
    yield "chance", result.chance.error, PROBABILITY


def _quantiles(name: str, found: Quantiles | RequiredTime) -> Iterator[tuple[str, float | None, float]]:
    for quantile in ("q05", "q16", "q50", "q84", "q95"):
        value = getattr(found, quantile)
        if value is None:
            continue
        spread = abs((found.q84 or value) - (found.q16 or value))
        allowed = MEDIAN if quantile == "q50" else OTHER
        yield f"{name}.{quantile}", found.error.get(quantile), allowed * max(abs(value), spread)
