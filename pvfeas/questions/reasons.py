"""What limits a scenario, why a goal is out of reach, and the nearest change that cures it."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from pvfeas.laws import Array
from pvfeas.questions.planning import Case
from pvfeas.questions.sections import closed_chance, unit_need
from pvfeas.required import counted
from pvfeas.results import Limiting

CLASSES = ("statistics", "reference", "systematics", "supply")


def _number(values: Array) -> float:
    return float(np.asarray(values).reshape(-1)[0])


def limiting(case: Case) -> Limiting:
    """Per draw the largest class of sigma^2 at the budget; supply where the sample ends the averaging first.

    Supply limits a draw whose statistics dominate, whose sample ends before the budget, and
    whose chance is then below one half.
    """
    scene, sample = case.full, case.full.sample
    averaging = scene.sampled.averaging
    parts = averaging.parts(averaging.best_time(np.asarray(case.budget)))
    classes = {
        name: sum((part for key, part in parts.items() if key.split(".")[0] == name), np.zeros((1, 1)))
        for name in CLASSES[:3]
    }
    largest = np.argmax(np.stack(np.broadcast_arrays(*classes.values())), axis=0)
    ended = (averaging.last < case.budget) & (closed_chance(scene, case.rule, case.budget) < 0.5)
    supply = (largest == 0) & ended
    shares: dict[str, float] = {}
    for place, name in enumerate(CLASSES):
        mine = supply if name == "supply" else (largest == place) & ~supply
        shares[name] = float(sample.average(mine.astype(float)).mean())
    return Limiting(max(CLASSES, key=lambda name: shares[name]), shares)


def reason(case: Case, reachable: float, median: float | None) -> tuple[str, str]:
    """Status and its reason, with the nearest change that cures an unreachable goal, at the nominal values."""
    status = "reachable" if median is not None else "unreachable"
    averaging = case.nominal.sampled.averaging
    need = _number(unit_need(case, case.nominal.sampled))
    signal = _number(counted(case.rule, case.nominal.signal_drawn))
    if not np.isfinite(need):
        return status, "the purity is not known well enough for the accuracy asked: lower samples.ee_known_to"
    if signal <= 0.0:
        return status, "the samples leave nothing of the splitting to be seen: raise samples.ee_a or samples.ee_b"
    allowed, last = signal / need, _number(averaging.last)
    left = _number(np.sqrt(averaging.best_variance(np.asarray(last))))
    if left <= allowed:
        if status == "reachable":
            return status, f"reachable in {_percent(reachable)} of the draws"
        return status, f"reachable at the nominal values, but in {_percent(reachable)} of the draws only"
    parts = {name: _number(part) for name, part in averaging.parts(np.asarray(last)).items()}
    said = f"sigma stops at {left:.3g} Hz where {allowed:.3g} Hz is needed"
    if np.isfinite(last) and parts["statistics"] + allowed**2 > left**2:
        missing = allowed**2 - (left**2 - parts["statistics"])
        more = parts["statistics"] / missing
        return (
            status,
            f"supply: the sample ends after {last / 86400:.3g} d and {said}; {more:.2g} times the sample cures it",
        )
    return status, _floor(said, parts, allowed)


def _floor(said: str, parts: Mapping[str, float], allowed: float) -> str:
    kept = {name: part for name, part in parts.items() if part > 0}
    name = max(kept, key=lambda one: kept[one])
    rest = sum(part for one, part in kept.items() if one != name)
    if rest < allowed**2:
        factor = np.sqrt(kept[name] / (allowed**2 - rest))
        return f"floor: {said}; {name} smaller by a factor {factor:.2g} cures it"
    return f"floor: {said}; no single part cures it, the largest is {name}"


def _percent(share: float) -> str:
    return f"{100 * share:.3g} %"
