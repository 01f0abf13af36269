"""The rows of the table of scenarios: a label and what each scenario has to say."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence

from pvfeas.output.words import error_text, exact_time, range_text, share, short
from pvfeas.results import Level, Quantiles, RequiredTime, ScenarioResult
from pvfeas.showing import digits, time_text, value_text

NOTHING = ("", "-")
MOST_PARTS = 6  # parts of sigma squared that get a row of their own
Show = Callable[[ScenarioResult], str]


def table_rows(scenarios: Sequence[ScenarioResult]) -> list[list[str]]:
    """All rows; one that says nothing for any scenario is left out."""
    rows = [[label, *(show(one) for one in scenarios)] for label, show in _rows(scenarios)]
    return [row for row in rows if any(cell not in NOTHING for cell in row[1:])]


def _rows(scenarios: Sequence[ScenarioResult]) -> Iterator[tuple[str, Show]]:
    yield "technique", lambda one: one.technique
    yield from _spread("splitting, true", lambda one: one.splitting)
    yield from _spread("splitting, seen", lambda one: one.signal)
    yield from _chance(scenarios)
    yield from _required(scenarios)
    yield from _sigma(scenarios)
    yield from _needed()
    yield from _reach()


def _middle(found: Quantiles | None) -> str:
    return "-" if found is None else short(value_text(found.q50, found.unit))


def _between(found: Quantiles | None) -> str:
    return "-" if found is None or found.q16 == found.q84 else range_text(found.q16, found.q84, found.unit)


def _spread(label: str, found: Callable[[ScenarioResult], Quantiles | None]) -> Iterator[tuple[str, Show]]:
    yield f"{label}, median", lambda one: _middle(found(one))
    yield "  16–84 %", lambda one: _between(found(one))


def _chance(scenarios: Sequence[ScenarioResult]) -> Iterator[tuple[str, Show]]:
    first = scenarios[0].chance
    yield f"chance within {exact_time(first.within.value)}", lambda one: share(one.chance.value)
    yield "  numerical error", lambda one: error_text(one.chance.error)
    for place, (within, _, _) in enumerate(first.at_each):
        if within != first.within:
            yield f"  within {exact_time(within.value)}", lambda one, place=place: share(one.chance.at_each[place][1])  # type: ignore[misc]
    yield "  for unlimited time", lambda one: share(one.chance.ceiling)
    yield "  inputs at their medians", lambda one: share(one.chance.nominal)
    for name in dict.fromkeys(key for one in scenarios for key in one.chance.per_calculation):
        yield f"  if {name} is right", lambda one, name=name: _calculation(one, name)  # type: ignore[misc]


def _calculation(one: ScenarioResult, name: str) -> str:
    value = one.chance.per_calculation.get(name)
    return "-" if value is None else share(value)


def _times(found: RequiredTime, low: str, high: str) -> str:
    return range_text(getattr(found, low), getattr(found, high), "s")


def _required(scenarios: Sequence[ScenarioResult]) -> Iterator[tuple[str, Show]]:
    yield "required time, median", lambda one: time_text(one.required_time.q50)
    yield "  numerical error", lambda one: error_text(one.required_time.error.get("q50"), one.required_time.q50)
    yield "  16–84 %", lambda one: _times(one.required_time, "q16", "q84")
    yield "  5–95 %", lambda one: _times(one.required_time, "q05", "q95")
    yield "  inputs at their medians", lambda one: time_text(one.required_time.nominal)
    yield "  by the linear law", _linear
    yield "  live time, median", lambda one: time_text(one.required_live_time.q50)
    for name in dict.fromkeys(key for one in scenarios for key in one.required_time.per_calculation):
        yield f"  if {name} is right", lambda one, name=name: _median_of(one, name)  # type: ignore[misc]
    yield "  reachable ever", lambda one: share(one.required_time.reachable)
    yield "  reachable in time", lambda one: share(one.required_time.in_time)


def _median_of(one: ScenarioResult, name: str) -> str:
    found = one.required_time.per_calculation
    return time_text(found[name]) if name in found else "-"


def _linear(one: ScenarioResult) -> str:
    found = one.linear
    if found.value is None or found.u_ln is None:
        return "-"
    if found.adequate is False:
        return "not adequate"
    return time_text(found.value) if found.u_ln == 0.0 else f"u(ln t) = {digits(found.u_ln, 2)}"


def _sigmas(value: float | None) -> str:
    return "-" if value is None else f"{digits(value)} sigma"


def _sigma(scenarios: Sequence[ScenarioResult]) -> Iterator[tuple[str, Show]]:
    yield "significance at budget", lambda one: "-" if one.significance is None else _sigmas(one.significance.q50)
    yield (
        "  16–84 %",
        lambda one: "-" if one.significance is None else range_text(one.significance.q16, one.significance.q84, "1"),
    )
    yield (
        "  surviving doubt of sizes",
        lambda one: "-" if one.significance is None else _sigmas(one.significance.surviving),
    )
    yield "sigma at budget", lambda one: _level(one.sigma.total, one.sigma.unit)
    yield "  statistical", lambda one: _level(one.sigma.statistical, one.sigma.unit)
    yield "  reference", lambda one: _level(one.sigma.reference, one.sigma.unit)
    yield "  systematic", lambda one: _level(one.sigma.systematic, one.sigma.unit)
    yield "limited by", lambda one: f"{one.limiting.name} {100 * one.limiting.shares.get(one.limiting.name, 1.0):.0f} %"
    names = _largest(scenarios)
    for name in names[:MOST_PARTS]:
        yield f"  sigma^2: {name.removeprefix('systematics.')}", lambda one, name=name: _part(one, name)  # type: ignore[misc]
    if names[MOST_PARTS:]:
        yield (
            "  sigma^2: all others",
            lambda one: f"{100 * sum(one.sigma.shares.get(each, 0.0) for each in names[MOST_PARTS:]):.1f} %",
        )


def _largest(scenarios: Sequence[ScenarioResult]) -> list[str]:
    shares: dict[str, float] = {}
    for one in scenarios:
        for name, part in one.sigma.shares.items():
            shares[name] = max(shares.get(name, 0.0), part)
    return [name for name in sorted(shares, key=lambda each: -shares[each]) if shares[name] > 0.0]


def _part(one: ScenarioResult, name: str) -> str:
    return f"{100 * one.sigma.shares[name]:.1f} %" if name in one.sigma.shares else "-"


def _level(level: Level | None, unit: str = "Hz") -> str:
    return "-" if level is None or level.q50 == 0.0 else short(value_text(level.q50, unit))


def _fraction(level: Level | None) -> str:
    if level is None or not level.q50:
        return "-"
    return short(f"1 part in {digits(1.0 / level.q50, 2)}")


def _needed() -> Iterator[tuple[str, Show]]:
    yield (
        "sigma needed, splitting",
        lambda one: "-" if one.resolution is None else _level(one.resolution.needed, one.resolution.unit),
    )
    yield (
        "  of one line centre",
        lambda one: "-" if one.resolution is None else _level(one.resolution.needed_centre, one.resolution.unit),
    )
    yield "  split the line width to", lambda one: "-" if one.resolution is None else _fraction(one.resolution.of_fwhm)
    yield "  of the frequency", lambda one: "-" if one.resolution is None else _fraction(one.resolution.of_frequency)


def _reach() -> Iterator[tuple[str, Show]]:
    yield "line centre, one cycle", lambda one: _middle(one.centre_uncertainty)
    yield "sensitivity", lambda one: _middle(one.sensitivity)
    yield from _spread("reach at budget", lambda one: one.reach)
    yield (
        "limit if no splitting",
        lambda one: "-" if one.limit is None else short(value_text(one.limit.q50, one.limit.unit)),
    )
    yield "  confidence", lambda one: "-" if one.limit is None else f"{100 * one.limit.confidence:.4g} %"
    yield "  construction", lambda one: "-" if one.limit is None else one.limit.construction
