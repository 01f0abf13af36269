"""From Study to Problem: references followed, products checked, laws fitted into their bounds."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from pvfeas.bounds import WARNED, Bounds, fitted, relative_spread
from pvfeas.correlations import checked_correlations
from pvfeas.errors import QuantityError
from pvfeas.faults import Faults
from pvfeas.keys import Key, keys_of
from pvfeas.laws import Exact, Law
from pvfeas.line import shape_of
from pvfeas.problem import Ensemble, Expression, Input, Problem, ScenarioProblem, Template, width_address
from pvfeas.quantity import Quantity, parse
from pvfeas.references import Places, dimension_text, fits
from pvfeas.study import Scenario, Study, Table, Written
from pvfeas.suggestions import did_you_mean
from pvfeas.systematics import dof_from_spread
from pvfeas.tables import Goal, Line, Reference, Samples, Schedule, Switching, Systematic
from pvfeas.techniques import TECHNIQUES
from pvfeas.units import wanted
from pvfeas.vocabulary import HWHM, SPLITTING

MOST_INPUTS, MOST_STRATA = 500, 1024
LONGEST_CHAIN = 50  # references that lead to references
ABOVE_ZERO = Bounds(lower=0.0, lower_open=True)
Warning_ = tuple[str, str, str]


def problem_of(study: Study) -> Problem:
    """The study as numbers. Raises StudyError with everything that is wrong."""
    faults = Faults(study.file, {})
    problem = compile_study(study, faults)
    faults.stop_if_any()
    assert problem is not None
    return problem


def compile_study(study: Study, faults: Faults) -> Problem | None:
    """The study as numbers; what is wrong goes to the collector and the result may then be None."""
    from pvfeas.judging import judge
    from pvfeas.resolving import study_hash

    maker = Compiler(study, faults)
    scenarios = tuple(maker.scenario(one) for one in study.scenario.values())
    maker.bind_unused_shared()
    inputs = maker.fitted_inputs()
    correlations = checked_correlations(study, inputs, maker.places, faults)
    if faults or not study.goal:
        return None
    goal = goal_of(study.goal)
    problem = Problem(
        title=study.title, sha256=study_hash(study), goal=goal,
        inputs=tuple(sorted(inputs, key=lambda one: one.address)), correlations=correlations, scenarios=scenarios,
        warnings=tuple(maker.warnings),
    )  # fmt: skip
    return judge(study, problem, maker, faults)


def goal_of(made: Mapping[str, Any]) -> Goal:
    """The goal with its defaults."""
    values = {}
    for name, key in keys_of(Goal).items():
        default = float(key.default) if key.sort == "quantity" and isinstance(key.default, str) else key.default
        values[name] = made.get(name, default)
    return Goal(**values)


def inside(address: str, written: Written) -> str:
    """The key of a quantity's table that an address leads to."""
    return address.removeprefix(written.address).lstrip(".")


class Compiler:
    """Turns written quantities into expressions of inputs, each input once."""

    def __init__(self, study: Study, faults: Faults) -> None:
        self.study = study
        self.faults = faults
        self.places = Places(study)
        self.sources: dict[str, tuple[Quantity, Written]] = {}
        self.bounds: dict[str, Bounds] = {}
        self.made: dict[str, Expression] = {}
        self.products: list[tuple[str, Written, Key, Expression]] = []
        self.warnings: list[Warning_] = []

    def complain(self, written: Written, found: str, right: str, key: str = "") -> None:
        """A fault at the quantity's own place, or at a key inside it."""
        line = self.faults.line_inside(written.address, key, written.line) if key else written.line
        self.faults.add(
            line, f"{written.address}.{key}" if key else written.address, found, right, written.file or None
        )

    # expressions

    def expression(self, written: Written, way: tuple[str, ...] = ()) -> Expression:
        """The written quantity as constant × inputs × powers, without `of` and `relative`."""
        if written.address in self.made:
            return self.made[written.address]
        if len(way) > LONGEST_CHAIN:
            self.complain(written, f"a chain of more than {LONGEST_CHAIN} references", "refer to the value itself")
            return Expression()
        if written.address in way:
            loop = " -> ".join([*way[way.index(written.address) :], written.address])
            self.complain(written, f"a circle of references: {loop}", "one of them must be a value")
            return Expression()
        made = self.whole(written.quantity, written.address, written, (*way, written.address))
        self.made[written.address] = made
        return made

    def whole(self, quantity: Quantity, address: str, written: Written, way: tuple[str, ...]) -> Expression:
        """A quantity with its factors and scales."""
        made = self.base(quantity, address, written, way)
        if quantity.discrepancy is not None:
            made = made.times(self.whole(quantity.discrepancy, f"{address}.discrepancy", written, way))
        for place, factor in enumerate(quantity.times):
            made = made.times(self.whole(factor, f"{address}.times[{place}]", written, way))
        for place, scale in enumerate(quantity.scale):
            here = f"{address}.scale[{place}]"
            over = self.whole(scale.with_, f"{here}.with", written, way)
            under = self.whole(scale.from_, f"{here}.from", written, way)
            self.same_dimension(scale.with_, scale.from_, written, f"scale[{place}].from")
            ratio = Expression(powers=((over, Expression(1.0)), (under, Expression(-1.0))))
            made = made.times(
                Expression(powers=((ratio, self.whole(scale.exponent, f"{here}.exponent", written, way)),))
            )
        return made

    def same_dimension(self, one: Quantity, other: Quantity, written: Written, key: str) -> None:
        first, second = self.places.dimension(one), self.places.dimension(other)
        if first is not None and second is not None and first != second:
            self.complain(
                written, f'"{other.text}" is {dimension_text(second)}, with is {dimension_text(first)}',
                "both must be of one dimension", key,
            )  # fmt: skip

    def base(self, quantity: Quantity, address: str, written: Written, way: tuple[str, ...]) -> Expression:
        """The value itself: an input of its own, or what it refers to."""
        if quantity.reference:
            target = self.places.find(quantity.reference)
            if target is None:
                names = self.places.names()
                hint = (
                    did_you_mean(quantity.reference, names)
                    or "name a key of [shared], or an address such as beam.line.fwhm"
                )
                self.complain(written, f'"@{quantity.reference}" refers to nothing', hint, inside(address, written))
                return Expression()
            return self.expression(target, way)
        self.sources[address] = (quantity, written)
        return Expression(inputs=(address,))

    # fields

    def field(self, written: Written, key: Key, scenario: Scenario | None = None) -> Expression:
        """The expression of a field: dimension checked, bounds passed on, FWHM turned into Hz."""
        made = self.expression(written)
        quantity = written.quantity
        dimension = self.places.dimension(quantity)
        along = key.along_line and self.places.along_line(quantity)
        expected = "1" if quantity.relative or along or written.unit == "1" else key.unit
        if (quantity.times or quantity.reference) and not along and not fits(dimension, expected):
            self.complain(written, f"the whole is {dimension_text(dimension or ())}", wanted(expected))
        self.pass_bounds(written, Bounds.of(key))
        if quantity.times or quantity.scale:
            self.products.append((written.address, written, key, made))
        if along and scenario is not None:
            made = made.times(self.width(scenario, written))
        return made

    def pass_bounds(self, written: Written, bounds: Bounds, way: tuple[str, ...] = ()) -> None:
        """Tell the inputs behind a field what it allows."""
        quantity, address = written.quantity, written.address
        if address in way:
            return
        if quantity.times or quantity.scale or quantity.discrepancy is not None:
            bounds = bounds.sign_only()
            for place, factor in enumerate(quantity.times):
                self.pass_to(factor, f"{address}.times[{place}]", bounds, (*way, address))
            if quantity.discrepancy is not None:
                self.pass_to(quantity.discrepancy, f"{address}.discrepancy", bounds, (*way, address))
        for place, scale in enumerate(quantity.scale):
            for part, one in (("with", scale.with_), ("from", scale.from_)):
                self.pass_to(one, f"{address}.scale[{place}].{part}", ABOVE_ZERO, (*way, address))
        self.pass_to(quantity, address, bounds, (*way, address))

    def pass_to(self, quantity: Quantity, address: str, bounds: Bounds, way: tuple[str, ...]) -> None:
        if quantity.reference:
            target = self.places.find(quantity.reference)
            if target is not None:
                self.pass_bounds(target, bounds, way)
        elif address in self.sources:
            self.bounds[address] = self.bounds.get(address, Bounds()).both(bounds)

    def width(self, scenario: Scenario, written: Written) -> Expression:
        """The line's full width."""
        line = scenario.line.quantities
        if "fwhm" in line:
            return self.field(line["fwhm"], keys_of(Line)["fwhm"])
        if "hwhm" in line:
            return Expression(2.0).times(self.field(line["hwhm"], HWHM))
        if shape_of(set(line)):
            return Expression(inputs=(width_address(scenario.name),))
        if self.faults.found:  # the width may be what is wrong
            return Expression()
        self.complain(
            written, "FWHM without a width of the line", 'give line = { fwhm = "…" }, or write the distance in Hz'
        )
        return Expression()

    def template(self, part: type, table: Table, scenario: Scenario, options: Mapping[str, Any] | None = None) -> Any:
        """A part with its expressions, defaults filled in as constants."""
        numbers: dict[str, Expression] = {}
        for name, key in keys_of(part).items():
            if key.sort != "quantity":
                continue
            if name in table.quantities:
                numbers[name] = self.field(table.quantities[name], key, scenario)
            elif isinstance(key.default, str):
                law = parse(key.default, key.unit).law
                assert isinstance(law, Exact)
                numbers[name] = Expression(law.value)
        return Template(part, numbers, {**table.options, **(options or {})})

    def scenario(self, one: Scenario) -> ScenarioProblem:
        """One scenario as numbers."""
        line = self.template(Line, one.line, one)
        if "hwhm" in one.line.quantities:
            written = one.line.quantities["hwhm"]
            line = Template(Line, {**line.quantities, "fwhm": self.width(one, written)}, line.options)
            self.warn("hwhm", written.address, "a half width was given; it is doubled")
        technique_a = self.template(TECHNIQUES[one.technique.kind], one.technique, one)
        samples_a = self.template(Samples, one.samples, one)
        technique_b, samples_b = technique_a, samples_a
        if one.technique_b is not None:
            technique_b = self.template(TECHNIQUES[one.technique_b.kind], one.technique_b, one)
        if one.samples_b is not None:
            samples_b = self.template(Samples, one.samples_b, one)
        return ScenarioProblem(
            name=one.name, splitting=self.splitting(one, line), line=line, technique_a=technique_a,
            technique_b=technique_b, switching=self.template(Switching, one.switching, one), samples_a=samples_a,
            samples_b=samples_b, schedule=self.template(Schedule, one.schedule, one),
            systematics=tuple(self.systematic(name, table, one) for name, table in one.systematics.items()),
            references=tuple(self.reference(name, table, one) for name, table in one.reference.items()),
            floor_declared=bool(one.systematics), schedule_declared=one.schedule.written,
        )  # fmt: skip

    def splitting(self, one: Scenario, line: Template[Line]) -> Expression:
        """The true difference nu(a) - nu(b): doubled where one enantiomer was predicted."""
        made = self.field(one.splitting, SPLITTING)
        if one.splitting.quantity.relative:
            if "frequency" not in line.quantities:
                self.complain(
                    one.splitting, "a relative splitting without a frequency", 'give line = { frequency = "…" }'
                )
            else:
                made = made.times(line.quantities["frequency"])
        return made if one.splitting_of == "difference" else Expression(2.0).times(made)

    def systematic(self, name: str, table: Table, one: Scenario) -> Template[Systematic]:
        """One systematic; degrees of freedom follow from the spread of its size where none are given."""
        made = self.template(Systematic, table, one, {"name": name})
        written = table.quantities.get("size")
        numbers = dict(made.quantities)
        if written is not None and "dof" not in numbers:
            law = self.places.law(written.quantity)
            spread = 0.0 if law is None else relative_spread(law)
            if spread > 0.0:
                numbers["dof"] = Expression(float(dof_from_spread(spread)))
        return Template(Systematic, numbers, made.options)

    def reference(self, name: str, table: Table, one: Scenario) -> Template[Reference]:
        """One kind of reference noise; the pairs of a table as numbers."""
        made: Template[Reference] = self.template(Reference, table, one, {"name": name})
        pairs = table.options.get("table")
        if pairs is None:
            return made
        numbers = tuple((exact(tau, "s"), exact(deviation, "Hz")) for tau, deviation in pairs)
        return Template(Reference, made.quantities, {**made.options, "table": numbers})

    # inputs

    def bind_unused_shared(self) -> None:
        """Shared quantities that nothing uses are inputs too: they can be swept and are checked."""
        for written in self.study.shared.values():
            self.expression(written)

    def fitted_inputs(self) -> list[Input]:
        """Every input with its law inside the bounds of all its uses."""
        if len(self.sources) > MOST_INPUTS:
            self.faults.add(0, "", f"{len(self.sources)} quantities", f"at most {MOST_INPUTS} are taken")
            return []
        found = []
        groups: dict[str, tuple[tuple[str, ...], tuple[float, ...], str]] = {}
        for address, (quantity, written) in self.sources.items():
            law = self.law_of(address, quantity, written, groups)
            if law is not None:
                found.append(Input(address, law))
        strata = 1
        for names, _, _ in groups.values():
            strata *= len(names)
        if strata > MOST_STRATA:
            where = next(written for quantity, written in self.sources.values() if quantity.members)
            self.complain(
                where, f"{strata} combinations of calculations", f"at most {MOST_STRATA}: tie the ensembles by group"
            )
        return found

    def law_of(
        self, address: str, quantity: Quantity, written: Written,
        groups: dict[str, tuple[tuple[str, ...], tuple[float, ...], str]],
    ) -> Law | Ensemble | None:  # fmt: skip
        """The law of an input, fitted; None where it does not fit (said)."""
        if not quantity.members:
            assert quantity.law is not None
            return self.fit(address, quantity.law, quantity.text, written)
        group = quantity.group or address
        names = tuple(name for name, _ in quantity.members)
        known = groups.setdefault(group, (names, quantity.weights, address))
        if known[0] != names or known[1] != quantity.weights:
            what = "members" if known[0] != names else "weights"
            names_ = f" ({', '.join(names)})" if what == "members" else ""
            key = "weights" if what == "weights" and "weights" in quantity.written else "values"
            self.complain(
                written,
                f"group {group!r} with other {what}{names_} than in {known[2]}",
                f"tied ensembles share names, order and weights: {', '.join(known[0])}",
                key,
            )
            return None
        laws = []
        for _, member in quantity.members:
            assert member.law is not None
            laws.append(self.fit(address, member.law, member.text, written))
        if any(law is None for law in laws):
            return None
        return Ensemble(names, tuple(law for law in laws if law is not None), quantity.weights, group)

    def fit(self, address: str, law: Law, text: str, written: Written) -> Law | None:
        try:
            inside, cut = fitted(law, self.bounds.get(address, Bounds()), text)
        except QuantityError as error:
            self.faults.add(written.line, address, error.found, error.wanted, written.file or None)
            return None
        if cut > WARNED:
            self.warn(
                "truncated", address, f'{100 * cut:.2g} % of "{text}" lie beyond what is possible and were cut away'
            )
        return inside

    def warn(self, code: str, address: str, message: str) -> None:
        """A doubt that travels with every result, said once where the quantity was written first."""
        address = self.places.origin(address)
        if (code, address, message) not in self.warnings:
            self.warnings.append((code, address, message))


def exact(text: str, unit: str) -> float:
    """An exact quantity that was checked when it was read."""
    law = parse(text, unit).law
    assert isinstance(law, Exact)
    return law.value
