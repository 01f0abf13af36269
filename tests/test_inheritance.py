"""What a scenario takes from another: merging, dropping, chains, --set, the same draw."""

from __future__ import annotations

from typing import Any

import pytest

from pvfeas import Options, StudyError, load_study, problem_of
from pvfeas.laws import Exact, Lognormal, Normal
from pvfeas.questions.compare import odds
from pvfeas.study import Scenario, Study

BASE = """title = "Compound K"

[goal]
kind = "detect"
significance = 5
power = 0.9
within = "60 d"

[shared]
theory = "1 ×/ 1.6"
ee = "0.97(1)"

[scenario.beam]
splitting = { value = "1.1(3) Hz", times = ["@theory"], of = "difference", source = "somebody 2020", status = "assumed" }

[scenario.beam.line]
frequency = "29.1 THz"
fwhm = { value = "12(2) kHz", source = "a test", status = "measured", demonstrated = "20 kHz" }

[scenario.beam.technique]
kind = "scan"
snr = "80 ×/ 1.3"
points = 60
span = "5 FWHM"
time = "2 s"
free = ["amplitude", "width", "baseline"]

[scenario.beam.samples]
ee_a = "@ee"
ee_b = "@ee"
mass = "2 g"
consumption = "8 mg/h"

[scenario.beam.systematics]
pressure = { size = "0.08 Hz ×/ 1.5", averages = "per reset", every = "1 d" }
asymmetry = { size = "0.02 Hz ×/ 1.6", averages = "never" }

"""


def study(more: str = "", *sets: tuple[str, str]) -> Study:
    return load_study(BASE + more, sets)


def child(more: str = "", *sets: tuple[str, str]) -> Scenario:
    return study('[scenario.child]\nbased_on = "beam"\n' + more, *sets).scenario["child"]


def faults(more: str, *sets: tuple[str, str]) -> list[tuple[int, str, str]]:
    with pytest.raises(StudyError) as caught:
        problem_of(study(more, *sets))
    return [(one.line, one.address, f"{one.found}; {one.wanted}") for one in caught.value.faults]


def law(table: Any, key: str) -> Any:
    return table.quantities[key].quantity.law


FIRST_OF_MORE = BASE.count("\n") + 1


# merging


def test_an_empty_child_is_the_parent() -> None:
    problem = problem_of(study('[scenario.child]\nbased_on = "beam"\n'))
    parent, heir = problem.scenarios
    for part in (
        "splitting",
        "line",
        "technique_a",
        "technique_b",
        "switching",
        "samples_a",
        "samples_b",
        "schedule",
        "systematics",
    ):
        assert getattr(heir, part) == getattr(parent, part), part
    assert problem.inputs == problem_of(study()).inputs


def test_tables_merge_and_inherited_keys_keep_their_address() -> None:
    found = child('line = { fwhm = "4(1) kHz" }\ntechnique = { time = "3 s" }\n')
    assert law(found.line, "fwhm") == Normal(4e3, 1e3)
    assert found.line.quantities["fwhm"].address == "child.line.fwhm"
    assert found.line.quantities["frequency"].address == "beam.line.frequency"
    assert found.technique.kind == "scan"
    assert law(found.technique, "time") == Exact(3.0)
    assert law(found.technique, "snr") == Lognormal(80.0, 1.3)
    assert found.technique.quantities["snr"].address == "beam.technique.snr"


def test_the_order_of_the_scenarios_does_not_matter() -> None:
    head, parent = BASE.split("[scenario.beam]", 1)
    heir = '[scenario.child]\nbased_on = "beam"\nline = { fwhm = "4(1) kHz" }\n'
    first, last = load_study(head + heir + "[scenario.beam]" + parent), study(heir)
    one, other = first.scenario["child"], last.scenario["child"]
    assert list(one.systematics) == list(other.systematics)
    for part in ("line", "technique", "samples"):
        a, b = getattr(one, part).quantities, getattr(other, part).quantities
        assert {key: written.address for key, written in a.items()} == {
            key: written.address for key, written in b.items()
        }


def test_a_leaf_is_replaced_whole() -> None:
    """Source and status go with the value; so do the factors of a splitting and the entries of a list."""
    found = child(
        'line = { fwhm = "4(1) kHz" }\nsplitting = { value = "2 Hz", of = "one enantiomer" }\ntechnique = { free = ["width"] }\n'
    )
    width = found.line.quantities["fwhm"].quantity
    assert (width.source, width.status, width.demonstrated) == ("", "", None)
    assert (found.splitting.quantity.times, found.splitting_of) == ((), "one enantiomer")
    assert (found.splitting.quantity.source, found.splitting.quantity.status) == ("", "")
    assert found.technique.options["free"] == ("width",)
    kept = child().line.quantities["fwhm"].quantity
    assert (kept.source, kept.status) == ("a test", "measured")


def test_a_technique_of_another_kind_replaces_the_table() -> None:
    found = child('technique = { kind = "quoted", uncertainty = "0.5 Hz", after = "1 h" }\n')
    assert found.technique.kind == "quoted"
    assert set(found.technique.quantities) == {"uncertainty", "after"}
    same = child('technique = { kind = "scan", points = 30 }\n')
    assert law(same.technique, "snr") == Lognormal(80.0, 1.3)
    (line, address, words), *more = faults(
        '[scenario.child]\nbased_on = "beam"\ntechnique = { kind = "quoted", after = "1 h" }\n'
    )
    assert (line, address, more) == (FIRST_OF_MORE + 2, "child.technique.uncertainty", [])
    assert "missing" in words


def test_alternatives_replace_each_other() -> None:
    """A half width in the child takes the place of the full width, a rate that of a number of molecules."""
    found = child('line = { hwhm = "3 kHz" }\n')
    assert set(found.line.quantities) == {"frequency", "hwhm"}
    ions = '[scenario.ions]\nbased_on = "beam"\ntechnique = { kind = "ramsey", free_time = "10 ms", contrast = "0.6(1)", molecules = "400" }\n'
    rate = study(ions + '[scenario.more]\nbased_on = "ions"\ntechnique = { rate = "80 1/s" }\n').scenario["more"]
    assert {"rate", "molecules"} & set(rate.technique.quantities) == {"rate"}
    assert law(rate.technique, "free_time") == Exact(0.01)


def test_systematics_merge_one_level_deeper() -> None:
    found = child(
        '[scenario.child.systematics]\npressure = { size = "0.02 Hz" }\nnew = { size = "0.1 Hz", averages = "never" }\n'
    )
    assert list(found.systematics) == ["pressure", "asymmetry", "new"]
    pressure = found.systematics["pressure"]
    assert law(pressure, "size") == Exact(0.02)
    assert (pressure.options["averages"], law(pressure, "every")) == ("per reset", Exact(86400.0))


def test_arm_b_merges_over_arm_a_and_is_inherited() -> None:
    arm = '[scenario.child.arm_b]\ntechnique = { snr = "60" }\n[scenario.grandchild]\nbased_on = "child"\n'
    heirs = study('[scenario.child]\nbased_on = "beam"\n' + arm).scenario
    for heir in (heirs["child"], heirs["grandchild"]):
        assert heir.technique_b is not None
        assert law(heir.technique_b, "snr") == Exact(60.0)
        assert heir.technique_b.quantities["snr"].address == "child.arm_b.technique.snr"
        assert heir.technique_b.quantities["time"].address == "beam.technique.time"
        assert heir.samples_b is None


# without


@pytest.mark.parametrize(
    ("entries", "systematics", "samples"),
    [
        ('["systematics.asymmetry"]', ["pressure"], {"ee_a", "ee_b", "mass", "consumption"}),
        ('["systematics"]', [], {"ee_a", "ee_b", "mass", "consumption"}),
        ('["samples.mass", "samples.consumption"]', ["pressure", "asymmetry"], {"ee_a", "ee_b"}),
        ('["samples", "systematics.pressure"]', ["asymmetry"], set()),
        ("[]", ["pressure", "asymmetry"], {"ee_a", "ee_b", "mass", "consumption"}),
    ],
)
def test_without(entries: str, systematics: list[str], samples: set[str]) -> None:
    found = child(f"without = {entries}\n")
    assert list(found.systematics) == systematics
    assert set(found.samples.quantities) == samples


def test_without_leaves_the_parent_alone_and_comes_before_the_child() -> None:
    both = study(
        '[scenario.child]\nbased_on = "beam"\nwithout = ["systematics.pressure"]\n[scenario.child.systematics]\npressure = { size = "1 Hz", averages = "never" }\n'
    )
    assert list(both.scenario["beam"].systematics) == ["pressure", "asymmetry"]
    anew = both.scenario["child"].systematics["pressure"]
    assert "every" not in anew.quantities  # nothing merged into what was dropped
    assert anew.options["averages"] == "never"


def test_without_what_is_not_there() -> None:
    found = faults('[scenario.child]\nbased_on = "beam"\nwithout = ["systematics.asymetry", "samples.mass.value"]\n')
    assert {address for _, address, _ in found} == {"child.without"}
    assert {line for line, _, _ in found} == {FIRST_OF_MORE + 2}
    assert any("asymetry" in words and "systematics.asymmetry?" in words for _, _, words in found)


# chains and circles


def test_chains() -> None:
    """c from b from beam: the nearest that says something is heard; without acts on the way."""
    heirs = study(
        '[scenario.c]\nbased_on = "b"\nline = { frequency = "30 THz" }\n'
        '[scenario.b]\nbased_on = "beam"\nwithout = ["systematics.asymmetry"]\nline = { fwhm = "4 kHz" }\ntechnique = { snr = "40" }\n'
    ).scenario
    found = heirs["c"]
    assert {key: one.address for key, one in found.line.quantities.items()} == {
        "frequency": "c.line.frequency",
        "fwhm": "b.line.fwhm",
    }
    assert found.technique.quantities["snr"].address == "b.technique.snr"
    assert found.technique.quantities["span"].address == "beam.technique.span"
    assert list(found.systematics) == ["pressure"]


@pytest.mark.parametrize(
    ("links", "circle"),
    [({"a": "a"}, "a -> a"), ({"a": "b", "b": "a"}, "a -> b -> a"), ({"a": "b", "b": "c", "c": "a"}, "a -> b -> c -> a"),
     ({"x": "a", "a": "b", "b": "a"}, "a -> b -> a")],
)  # fmt: skip
def test_circles_are_named_once(links: dict[str, str], circle: str) -> None:
    """Whoever closes the circle is told; nobody complains of what cannot be inherited."""
    more = "".join(f'[scenario.{name}]\nbased_on = "{parent}"\n' for name, parent in links.items())
    ((line, address, words),) = faults(more)
    assert circle in words
    last = circle.split(" -> ")[-2]
    assert address == f"{last}.based_on"
    assert line == FIRST_OF_MORE + 2 * list(links).index(last) + 1


def test_a_fault_in_an_inherited_line_is_told_once_where_it_stands() -> None:
    wrong = BASE.replace('"29.1 THz"', '"29.1 kg"') + "".join(f'[scenario.s{i}]\nbased_on = "beam"\n' for i in range(5))
    with pytest.raises(StudyError) as caught:
        load_study(wrong)
    (fault,) = caught.value.faults
    assert fault.address == "beam.line.frequency"
    assert fault.line == wrong[: wrong.index("29.1 kg")].count("\n") + 1


# --set


def test_set_acts_before_based_on() -> None:
    """On the parent it reaches the child that says nothing of its own; on the child it stays there."""
    found = study(
        '[scenario.child]\nbased_on = "beam"\nline = { fwhm = "4 kHz" }\n',
        ("beam.technique.snr", "40"),
        ("beam.line.fwhm", "9 kHz"),
    ).scenario
    for name in ("beam", "child"):
        assert law(found[name].technique, "snr") == Exact(40.0)
    assert law(found["beam"].line, "fwhm") == Exact(9e3)
    assert law(found["child"].line, "fwhm") == Exact(4e3)
    only = study('[scenario.child]\nbased_on = "beam"\n', ("child.technique.snr", "40")).scenario
    assert law(only["beam"].technique, "snr") == Lognormal(80.0, 1.3)
    assert law(only["child"].technique, "snr") == Exact(40.0)
    assert only["child"].technique.quantities["span"].address == "beam.technique.span"


def test_set_says_where_the_value_comes_from() -> None:
    found = study("", ("beam.line.fwhm", "9(1) kHz"), ("beam.splitting", "3 Hz"), ("shared.theory", "1 ×/ 2")).scenario[
        "beam"
    ]
    for written in (found.line.quantities["fwhm"], found.splitting):
        assert (written.quantity.status, written.quantity.source) == ("assumed", "command line")
    assert found.splitting_of == "difference"
    assert found.splitting.quantity.times == ()


@pytest.mark.parametrize(
    ("address", "value", "read"),
    [
        ("title", "other", lambda s: s.title == "other"),
        ("goal.power", "0.8", lambda s: s.goal["power"] == 0.8),
        ("goal.within", '["10 d", "5 d"]', lambda s: s.goal["within"] == (432e3, 864e3)),
        ("goal.trials", "3", lambda s: s.goal["trials"] == 3),
        ("shared.new", "5 kHz", lambda s: law_of_shared(s, "new") == Exact(5e3)),
        ("beam.technique.points", "30", lambda s: law(s.scenario["beam"].technique, "points") == Exact(30.0)),
        ("beam.technique.free", '["width"]', lambda s: s.scenario["beam"].technique.options["free"] == ("width",)),
        ("beam.line.fwhm", '{ value = "9", unit = "kHz", note = "x" }', lambda s: law(s.scenario["beam"].line, "fwhm") == Exact(9e3)),
        ("beam.line.fwhm.value", "9(1) kHz", lambda s: law(s.scenario["beam"].line, "fwhm") == Normal(9e3, 1e3)),
        ("beam.line", '{ fwhm = "9 kHz" }', lambda s: set(s.scenario["beam"].line.quantities) == {"fwhm"}),
        ("beam.systematics.pressure.size", "1 Hz", lambda s: law(s.scenario["beam"].systematics["pressure"], "size") == Exact(1.0)),
        ("beam.systematics", '{ z = { size = "1 Hz", averages = "never" } }', lambda s: list(s.scenario["beam"].systematics) == ["z"]),
        ("beam.schedule.uptime", "0.5", lambda s: law(s.scenario["beam"].schedule, "uptime") == Exact(0.5)),
        ("child.based_on", "beam", lambda s: s.scenario["child"].based_on == "beam"),
        ("child.without", '["systematics.asymmetry"]', lambda s: list(s.scenario["child"].systematics) == ["pressure"]),
        ("child.line", '{ fwhm = "9 kHz" }', lambda s: set(s.scenario["child"].line.quantities) == {"fwhm", "frequency"}),
    ],
)  # fmt: skip
def test_what_can_be_set(address: str, value: str, read: Any) -> None:
    found = study('[scenario.child]\nbased_on = "beam"\n', (address, value))
    assert read(found)
    assert problem_of(found).scenarios


def law_of_shared(found: Study, name: str) -> Any:
    return found.shared[name].quantity.law


@pytest.mark.parametrize(
    ("address", "value", "words"),
    [
        ("beem.line.fwhm", "9 kHz", "beam"),
        ("beam", "9 kHz", "beam.KEY"),
        ("", "9 kHz", "goal"),
        ("beam.line.fwmh", "9 kHz", "fwhm"),
        ("beam.line.fwhm", "9 kg", "frequency"),
        ("beam.line.fwhm", "{ value = ", "TOML"),
        ("beam.line", "9 kHz", "table"),
        ("beam.technique.points", "many", "number"),
        ("goal.trials", "many", "whole number"),
        ("beam.line.fwhm.vlaue", "9 kHz", "value"),
        ("beam.line.fwhm", "[" * 10**5, "nested"),
        ("beam.line.fwhm", "[" * 200 + "]" * 200, "nested"),
        ("beam.line.fwhm", "[" + "1" * 10**4 + "]", "digits"),
        ("beam.line.fwhm", "1" * 10**5, "1000"),
    ],
)
def test_what_cannot_be_set(address: str, value: str, words: str) -> None:
    ((line, where, said),) = faults("", (address, value))
    assert (line, words in said) == (0, True), said
    assert where == address
    assert "Set(" not in said


# inherited by reference: the same draw


def test_inherited_inputs_are_one_input() -> None:
    """Twice the splitting and all else inherited: always sooner. Written anew, widths alone decide: even odds."""
    heir = '[scenario.child]\nbased_on = "beam"\nsplitting = {{ value = "2.2 Hz", of = "difference" }}\nwithout = ["systematics"]\n{}'
    parent = '[scenario.rival]\nbased_on = "child"\nsplitting = {{ value = "{} Hz", of = "difference" }}\n{}'
    tied = problem_of(study(heir.format("") + parent.format(2.0, "")))
    found = next(
        one for one in odds(tied, (), Options(maximum_points=256)) if (one.first, one.second) == ("child", "rival")
    )
    assert found.second_sooner == 0.0
    assert found.first_sooner + found.neither == pytest.approx(1.0, abs=2 * found.error)  # the supply may end first
    addresses = [one.address for one in tied.inputs]
    assert len(addresses) == len(set(addresses))
    assert not [one for one in addresses if one.startswith("rival.") and one != "rival.splitting"]
    apart = problem_of(study(heir.format("") + parent.format(2.2, 'technique = { snr = "80 ×/ 1.3" }\n')))
    assert {one.address for one in apart.inputs} - {one.address for one in tied.inputs} == {"rival.technique.snr"}
    found = next(
        one for one in odds(apart, (), Options(maximum_points=1024)) if (one.first, one.second) == ("child", "rival")
    )
    assert found.first_sooner == pytest.approx(0.5, abs=max(3 * found.error, 0.01))  # two draws of one law
