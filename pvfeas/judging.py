"""What can only be judged with numbers: products, unresolved lines, what systematics refer to, plausibility."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

import numpy as np

from pvfeas.averaging import purity
from pvfeas.faults import Faults
from pvfeas.line import shape_of
from pvfeas.nominal import nominal_draws
from pvfeas.points import draw
from pvfeas.problem import Draws, Expression, Problem, ScenarioProblem
from pvfeas.showing import value_text
from pvfeas.study import Scenario, Study

if TYPE_CHECKING:
    from pvfeas.compiler import Compiler

REFUSED, WARNED = 0.05, 0.001
RESOLVED, DOUBTFUL = 0.5, 0.1  # of the interrogation width


def judge(study: Study, problem: Problem, maker: Compiler, faults: Faults) -> Problem | None:
    """The problem with its warnings and with products kept inside their bounds; None where it cannot stand."""
    nominal = nominal_draws(problem.inputs)
    limits = product_limits(problem, maker, faults)
    scenarios = []
    for one in problem.scenarios:
        written = study.scenario[one.name]
        systematics_fit(study, one, written, faults)
        if not faults:
            unresolved(one, written, nominal, maker)
            signless(problem, one, written, nominal, maker)
            absent(one, maker)
        scenarios.append(_limited(one, limits))
    for one in problem.scenarios:
        plausible(one, study.scenario[one.name], nominal, maker)
    if faults:
        return None
    return replace(problem, scenarios=tuple(scenarios), warnings=tuple(maker.warnings))


def product_limits(problem: Problem, maker: Compiler, faults: Faults) -> dict[Expression, tuple[float, float]]:
    """Products that may leave their field's bounds: refused above 5 %, else cut at the bound."""
    if not maker.products or faults:
        return {}
    sample = draw(problem.inputs, (), 1, 8)
    found = {}
    for address, written, key, expression in maker.products:
        values = expression.at(sample.draws)
        if written.quantity.relative or (np.isinf(key.lower) and np.isinf(key.upper)):
            continue
        outside = float(sample.average(((values < key.lower) | (values > key.upper)).astype(float)).mean())
        if outside > REFUSED:
            maker.complain(
                written,
                f"{100 * outside:.2g} % of the product lie beyond its bounds",
                "a smaller spread, or laws of one sign, are needed",
            )
        elif outside > 0.0:
            small = 1e-9 * float(np.abs(values).max())
            low = key.lower + (small if key.lower_open else 0.0)
            found[expression] = (low, key.upper - (small if key.upper_open else 0.0))
            if outside > WARNED:
                maker.warn(
                    "truncated",
                    address,
                    f"{100 * outside:.2g} % of the product lie beyond what is possible and were cut away",
                )
    return found


def _limited(one: ScenarioProblem, limits: dict[Expression, tuple[float, float]]) -> ScenarioProblem:
    if not limits:
        return one
    made = {}
    for name in ("line", "technique_a", "technique_b", "switching", "samples_a", "samples_b", "schedule"):
        template = getattr(one, name)
        numbers = {key: replace(e, limits=limits[e]) if e in limits else e for key, e in template.quantities.items()}
        made[name] = replace(template, quantities=numbers)
    entries = tuple(
        replace(t, quantities={k: replace(e, limits=limits[e]) if e in limits else e for k, e in t.quantities.items()})
        for t in one.systematics
    )
    references = tuple(
        replace(t, quantities={k: replace(e, limits=limits[e]) if e in limits else e for k, e in t.quantities.items()})
        for t in one.references
    )
    return replace(one, systematics=entries, references=references, **made)


def systematics_fit(study: Study, one: ScenarioProblem, written: Scenario, faults: Faults) -> None:
    """Whether there is what the sizes are fractions of."""
    technique = one.technique_a.part
    for table in written.systematics.values():
        size = table.quantities.get("size")
        on = table.options.get("on", "hertz")
        if size is None or on == "hertz":
            continue
        address = size.address.rpartition(".")[0] + ".on"
        if on == "frequency" and "frequency" not in one.line.quantities:
            faults.add(size.line, address, 'on = "frequency" without a frequency', 'give line = { frequency = "…" }')
        if on == "width" and technique.kind == "quoted" and not has_width(one):
            faults.add(size.line, address, 'on = "width" without a width', 'give line = { fwhm = "…" }')
        if on == "scale" and study.goal.get("kind") != "measure":
            faults.add(
                size.line,
                address,
                'on = "scale" in a goal that does not measure',
                'it belongs to kind = "measure": drop the entry',
            )
        if on == "signal":
            faults.add(
                size.line, address, 'on = "signal" for a technique that sees Hz', "give the size in Hz and drop on"
            )


def has_width(one: ScenarioProblem) -> bool:
    """Whether the line has a width, given or composed."""
    keys = set(one.line.quantities)
    return "fwhm" in keys or bool(shape_of(keys))


def unresolved(one: ScenarioProblem, written: Scenario, nominal: Draws, maker: Compiler) -> None:
    """The splitting must stay small against the interrogation width."""
    drawn = one.with_width(nominal)
    line, technique = one.line.at(drawn), one.technique_a.at(drawn)
    width = technique.interrogation_width(line)
    if width is None:
        return
    samples_a, samples_b = one.samples_a.at(nominal), one.samples_b.at(nominal)
    seen = np.abs(one.splitting.at(nominal) * purity(samples_a.ee_a, samples_b.ee_b))
    ratio = float(np.reshape(seen / width, -1)[0])
    if ratio > RESOLVED:
        maker.complain(
            written.splitting, f"the splitting is {ratio:.2g} of the width",
            "above one half the two lines are resolved, and the difference of two centres is not what limits",
        )  # fmt: skip
    elif ratio > DOUBTFUL:
        maker.warn(
            "nearly resolved",
            written.splitting.address,
            f"the splitting is {ratio:.2g} of the width: the purity factor holds for unresolved lines",
        )


def signless(problem: Problem, one: ScenarioProblem, written: Scenario, nominal: Draws, maker: Compiler) -> None:
    """One side means that the sign is predicted: that of the splitting's median."""
    if problem.goal.sides == 1 and float(np.reshape(one.splitting.at(nominal), -1)[0]) == 0.0:
        maker.complain(
            written.splitting,
            "sides = 1 with a splitting whose median is zero",
            "a predicted sign is needed, or sides = 2",
        )


def absent(one: ScenarioProblem, maker: Compiler) -> None:
    """What was left out and what that means."""
    if not one.floor_declared:
        maker.warn("no floor", f"{one.name}.systematics", "no floor declared: sigma falls without end")
    if not one.schedule_declared:
        maker.warn("no schedule", f"{one.name}.schedule", "no schedule declared: 24 h a day, 7 days a week")


def plausible(one: ScenarioProblem, written: Scenario, nominal: Draws, maker: Compiler) -> None:
    """Slips between mHz and MHz."""
    splitting = float(np.abs(np.reshape(one.splitting.at(nominal), -1)[0]))
    if splitting > 1e6:
        maker.warn(
            "plausibility",
            written.splitting.address,
            f"a splitting of {value_text(splitting, 'Hz')} is far above every prediction: MHz for mHz?",
        )
    frequency = one.line.at(nominal).frequency
    if frequency is not None and float(np.reshape(frequency, -1)[0]) < 1e6:
        shown = value_text(float(np.reshape(frequency, -1)[0]), "Hz")
        maker.warn(
            "plausibility",
            written.line.quantities["frequency"].address,
            f"a line at {shown} is unusually low: mHz for MHz?",
        )
