"""What was understood of a study, and what two scenarios write differently."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from typing import Any

import numpy as np

from pvfeas.compiler import problem_of
from pvfeas.laws import Beta, Exact, Law, Lognormal, LogUniform, Normal, Truncated, TwoPiece, Uniform
from pvfeas.nominal import nominal_draws
from pvfeas.problem import Ensemble, Problem
from pvfeas.quantity import Quantity
from pvfeas.references import addresses, tables_of
from pvfeas.results import Difference, InputRow, Understood, Warned
from pvfeas.showing import digits, value_text
from pvfeas.study import Study, Written


def understood(study: Study) -> Understood:
    """Every input in words; what is exact, what is assumed, what has no source."""
    problem = problem_of(study)
    own = {w.address: w for w in addresses(study).values()}
    rows, exact, assumed, bare = [], [], [], []
    for one in problem.inputs:
        written = own.get(one.address)
        quantity = written.quantity if written else None
        unit = "" if written is None else written.unit
        along = quantity is not None and quantity.along_line
        rows.append(
            InputRow(
                one.address,
                quantity.text if quantity else "",
                law_in_words(one.law, "FWHM" if along else unit),
                quantity.status if quantity else "",
                quantity.source if quantity else "",
            )  # fmt: skip
        )
        if isinstance(one.law, Exact):
            exact.append(one.address)
        if quantity is not None and quantity.status in ("assumed", "extrapolated"):
            assumed.append(one.address)
        if quantity is not None and not quantity.source:
            bare.append(one.address)
    return Understood(
        title=study.title, rows=tuple(rows), widths=tuple(compositions(problem)),
        exact=tuple(exact), assumed=tuple(assumed), without_source=tuple(bare),
        warnings=tuple(Warned(*one) for one in problem.warnings),
    )  # fmt: skip


def compositions(problem: Problem) -> Iterator[str]:
    """For each composed line its parts at the medians, what they add up to, and which one dominates."""
    nominal = nominal_draws(problem.inputs)
    for one in problem.scenarios:
        line = one.line.at(nominal)
        parts = {name: (kind, float(np.reshape(width, -1)[0])) for name, (kind, width) in line.parts().items()}
        if not parts or line.width is None:
            continue
        listed = ", ".join(f"{name} {value_text(width, 'Hz')} ({kind})" for name, (kind, width) in parts.items())
        total = value_text(float(np.reshape(line.width, -1)[0]), "Hz")
        largest = max(parts, key=lambda name: parts[name][1])
        together = f"together {total} ({line.shape}), {largest} dominates"
        yield f"{one.name}.line: {listed}; {together}; full widths at the medians"


def law_in_words(law: Law | Ensemble, unit: str) -> str:
    """A law as a phrase."""

    def show(value: float) -> str:
        if unit in ("", "*", "1", "FWHM"):
            return f"{digits(value, 4)}{' FWHM' if unit == 'FWHM' else ''}"
        return value_text(value, unit, 4)

    if isinstance(law, Ensemble):
        members = ", ".join(
            f"{name} {law_in_words(one, unit)}" for name, one in zip(law.members, law.laws, strict=True)
        )
        return f"{len(law.members)} calculations: {members}"
    if isinstance(law, Exact):
        return f"exactly {show(law.value)}"
    if isinstance(law, Normal):
        return f"normal, {show(law.mean)} with standard deviation {show(law.sd)}"
    if isinstance(law, TwoPiece):
        low, high = show(law.median - law.minus), show(law.median + law.plus)
        return f"two-piece normal, median {show(law.median)}, 16 % at {low}, 84 % at {high}"
    if isinstance(law, Lognormal):
        return f"lognormal, median {show(law.median)}, factor {digits(law.factor)}"
    if isinstance(law, Uniform | LogUniform):
        kind = "uniform" if isinstance(law, Uniform) else "log-uniform"
        return f"{kind} from {show(law.lower)} to {show(law.upper)}"
    if isinstance(law, Beta):
        ends = f"{digits(law.lower)} and {digits(law.upper)}"
        return f"beta between {ends}, mean {show(law.mean)}, standard deviation {show(law.sd)}"
    if isinstance(law, Truncated):
        lost = 1.0 - float(law.base.below(law.upper)) + float(law.base.below(law.lower))
        cut = f", cut to what is possible ({100 * lost:.2g} %)" if lost > 1e-6 else ""
        return f"{law_in_words(law.base, unit)}{cut}"
    return type(law).__name__


def differences(study: Study, names: Sequence[str]) -> tuple[Difference, ...]:
    """Keys whose text or value is not the same in all the named scenarios."""
    described = [_described(study, name) for name in names or study.scenario]
    keys = list(dict.fromkeys(key for one in described for key in one))
    found = [Difference(key, tuple(one.get(key, "-") for one in described)) for key in keys]
    return tuple(one for one in found if len(set(one.texts)) > 1)


def _described(study: Study, name: str) -> dict[str, str]:
    scenario = study.scenario[name]
    content = {"splitting": _text(scenario.splitting), "splitting.of": scenario.splitting_of}
    for address, table in tables_of(study, name):
        short = address.removeprefix(f"{name}.")
        if table.kind:
            content[f"{short}.kind"] = table.kind
        content |= {f"{short}.{key}": _text(written) for key, written in table.quantities.items()}
        content |= {f"{short}.{key}": _option(value) for key, value in table.options.items()}
    return content


def _text(written: Written) -> str:
    return _quantity_text(written.quantity)


def _quantity_text(quantity: Quantity) -> str:
    if quantity.members:
        return ", ".join(f"{name} {member.text}" for name, member in quantity.members)
    factors = "".join(f" × {_quantity_text(one)}" for one in quantity.times)
    scales = "".join(
        f" × ({_quantity_text(s.with_)} / {_quantity_text(s.from_)})^{s.exponent.text}" for s in quantity.scale
    )
    return f"{quantity.text}{factors}{scales}"


def _option(value: Any) -> str:
    return ", ".join(value) if isinstance(value, tuple) else str(value)
