"""Sentences about results."""

from __future__ import annotations

from pvfeas.results import ScenarioResult
from pvfeas.showing import time_text

CAUTION = (
    "A planning estimate, not a safety review: lasers, high voltage, cryogens and toxic heavy-metal compounds are "
    "for local rules and qualified people to decide."
)


def share(value: float) -> str:
    """A probability in per cent; never 0 or 100 unless it is."""
    if value in (0.0, 1.0):
        return f"{100 * value:.0f} %"
    if value < 0.001:
        return "< 0.1 %"
    if value > 0.999:
        return "> 99.9 %"
    return f"{100 * value:.1f} %"


def verdict(one: ScenarioResult) -> str:
    """The answer in one or two sentences."""
    chance = one.chance
    goal = "" if chance.goal_met is None else "; goal met" if chance.goal_met else f"; goal of {share(one.contract.power or 0.0)} not met"
    said = f"{one.name}: chance {share(chance.value)} within {time_text(chance.within.value)}{goal}."
    times = one.required_time
    if times.q50 is None:
        said += f" Required time: never in {share(1.0 - times.reachable)} of the draws."
    else:
        late = "never" if times.q95 is None else time_text(times.q95)
        said += f" Required time: median {time_text(times.q50)}, 5–95 % {time_text(times.q05)} – {late}."
    return f"{said} {one.reason[:1].upper()}{one.reason[1:]}."
