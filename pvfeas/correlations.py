"""Correlations between inputs: what they may tie, and whether they can all hold together."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from itertools import combinations

import numpy as np

from pvfeas.faults import Faults
from pvfeas.problem import Correlation, Ensemble, Input
from pvfeas.references import Places
from pvfeas.study import Correlated, Study
from pvfeas.suggestions import did_you_mean

MOST_SEARCHED = 12  # inputs among which the smallest impossible set is looked for


def checked_correlations(
    study: Study, inputs: Sequence[Input], places: Places, faults: Faults
) -> tuple[Correlation, ...]:
    """The correlations of a study; what is wrong goes to the collector."""
    laws = {one.address: one.law for one in inputs}
    found: dict[frozenset[str], Correlation] = {}
    for one in study.correlation:
        ends = tuple(_input_of(name, one, laws, places, faults) for name in one.between)
        if any(end is None for end in ends):
            continue
        pair = (str(ends[0]), str(ends[1]))
        if pair[0] == pair[1]:
            _say(
                faults,
                one,
                f"{one.between[0]} and {one.between[1]} are the same input",
                "correlate two different inputs",
            )
        elif frozenset(pair) in found:
            _say(faults, one, f"{pair[0]} and {pair[1]} are correlated twice", "give each pair once")
        else:
            found[frozenset(pair)] = Correlation(pair, one.rho)
    kept = tuple(found.values())
    broken = impossible_set(kept)
    if broken:
        last = next(
            c for c in reversed(study.correlation) if set(c.between) <= set(broken) | ends_of(c, broken, places)
        )
        names = ", ".join(broken)
        _say(
            faults,
            last,
            f"the correlations of {names} cannot all hold",
            "the matrix is not positive semi-definite: weaken one of them",
        )
    return kept


def ends_of(one: Correlated, broken: Sequence[str], places: Places) -> set[str]:
    """The names of a correlation that lead to inputs of an impossible set."""
    found = set()
    for name in one.between:
        written = places.find(name)
        while written is not None and written.quantity.reference and written.address not in broken:
            written = places.find(written.quantity.reference)
        if written is not None and written.address in broken:
            found.add(name)
    return found


def _say(faults: Faults, one: Correlated, found: str, wanted: str) -> None:
    faults.add(one.line, f"correlation[{one.place}].between", found, wanted)


def _input_of(name: str, one: Correlated, laws: Mapping[str, object], places: Places, faults: Faults) -> str | None:
    written = places.find(name)
    address = name if name in laws else written.address if written is not None else ""
    while written is not None and written.quantity.reference and address not in laws:
        written = places.find(written.quantity.reference)
        address = written.address if written is not None else ""
    if address not in laws:
        if written is None:
            _say(
                faults,
                one,
                f"{name!r} is no input",
                did_you_mean(name, list(laws)) or "name the address of an uncertain input",
            )
        return None
    law = laws[address]
    if isinstance(law, Ensemble):
        _say(faults, one, f"{name} is an ensemble", "ensembles are tied by group, not by correlation")
        return None
    if law.lower == law.upper:  # type: ignore[attr-defined]  # every law has a support
        _say(faults, one, f"{name} is exact", "only uncertain inputs are correlated")
        return None
    return address


def matrix_of(names: Sequence[str], correlations: Sequence[Correlation]) -> np.ndarray:
    """The correlation matrix of the named inputs."""
    place = {name: i for i, name in enumerate(names)}
    matrix = np.eye(len(names))
    for one in correlations:
        if one.between[0] in place and one.between[1] in place:
            i, j = place[one.between[0]], place[one.between[1]]
            matrix[i, j] = matrix[j, i] = one.rho
    return matrix


def impossible_set(correlations: Sequence[Correlation]) -> tuple[str, ...]:
    """The smallest set of inputs whose correlations cannot all hold; empty where all is well."""
    names = sorted({name for one in correlations for name in one.between})
    if not names or np.linalg.eigvalsh(matrix_of(names, correlations))[0] > -1e-9:
        return ()
    if len(names) <= MOST_SEARCHED:
        for size in range(3, len(names)):
            for some in combinations(names, size):
                if np.linalg.eigvalsh(matrix_of(some, correlations))[0] < -1e-9:
                    return some
    return tuple(names)
