"""The resolved study and one built in Python: they say the same as the file, to the last byte of the answer."""

from __future__ import annotations

import tomllib
from pathlib import Path
from typing import Any

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from test_inheritance import BASE, FIRST_OF_MORE, faults, study

from pvfeas import Options, StudyError, assess, load_study, problem_of, resolve
from pvfeas.output.json import assessment_content, to_json
from pvfeas.problem import Problem, Template
from pvfeas.resolving import study_hash
from pvfeas.starters import starter
from pvfeas.study import Study
from pvfeas.techniques import TECHNIQUES

ROOT = Path(__file__).resolve().parent.parent
EXAMPLES = sorted((ROOT / "data" / "studies").glob("*.toml"))


def parts(problem: Problem) -> list[list[Any]]:
    """Every part of every scenario with its defaults filled in, expressions standing for numbers."""
    found = []
    for one in problem.scenarios:
        plain = (value for name, value in vars(one).items() if name not in ("systematics", "references"))
        values = [*plain, *one.systematics, *one.references]
        found.append([v.part(**v.quantities, **v.options) if isinstance(v, Template) else v for v in values])
    return found


def same(one: Study, other: Study) -> None:
    """The same hash, and as numbers the same: inputs, expressions, goal, correlations."""
    assert study_hash(one) == study_hash(other)
    first, second = problem_of(one), problem_of(other)
    assert (first.goal, first.inputs, parts(first)) == (second.goal, second.inputs, parts(second))
    assert (first.correlations, first.warnings, first.sha256) == (second.correlations, second.warnings, second.sha256)


HEIRS = """
[[correlation]]
between = ["beam.technique.snr", "beam.line.fwhm"]
rho = -0.3
[scenario.colder]
based_on = "beam"
without = ["systematics.asymmetry"]
line = { fwhm = "4(1) kHz" }
[scenario.fraction]
based_on = "colder"
splitting = { value = "4(1)e-14", relative = true, of = "difference" }
[scenario.fraction_too]
based_on = "fraction"
[scenario.4K]
based_on = "colder"
splitting = { values = { HF = "1.0 Hz", DFT = "2.0(3) Hz" }, weights = [1, 3], times = ["@theory"], of = "one enantiomer" }
[scenario.4K.arm_b]
technique = { snr = { value = "20", scale = [{ with = "@4K.line.fwhm", from = "12 kHz", exponent = "0.5" }] } }
samples = { mass = "1 g" }
[scenario.-x_1]
based_on = "4K"
technique = { kind = "quoted", uncertainty = { p05 = "0.1 Hz", p95 = "0.9 Hz" }, after = "1 h", of = "one enantiomer" }
without = ["arm_b"]
"""


def answer(found: Study) -> str:
    return to_json(assessment_content(assess(problem_of(found), Options(tolerance=50.0, maximum_points=256))))


def test_the_resolved_study_gives_the_same_answer() -> None:
    """Same hash, same bytes of JSON; from Python too."""
    written = study(HEIRS)
    resolved = resolve(written)
    assert "based_on" not in resolved
    assert "without" not in resolved
    content = tomllib.loads(BASE + HEIRS)
    for again in (
        load_study(resolved),
        Study.from_toml(resolved),
        Study.from_dict(tomllib.loads(resolved)),
        Study.from_dict(content),
    ):
        same(written, again)
        assert resolve(again) == resolved
    assert answer(Study.from_dict(tomllib.loads(resolved))) == answer(written)


@pytest.mark.parametrize("path", EXAMPLES, ids=lambda path: path.stem)
def test_examples_resolve_to_the_same_answer(path: Path) -> None:
    written = load_study(path)
    again = load_study(resolve(written))
    same(written, again)
    assert answer(again) == answer(written)


@pytest.mark.parametrize("kind", sorted(TECHNIQUES))
def test_starters_resolve_to_the_same_problem(kind: str) -> None:
    written = Study.from_toml(starter(kind))
    same(written, Study.from_toml(resolve(written)))


def test_settings_resolve_too() -> None:
    sets = (
        ("beam.line.fwhm", "9(1) kHz"),
        ("beam.splitting", "3 Hz"),
        ("goal.within", '["10 d", "5 d"]'),
        ("title", 'a "b" \\ \n µ'),
    )
    written = study(HEIRS, *sets)
    same(written, load_study(resolve(written)))
    same(written, Study.from_dict(tomllib.loads(BASE + HEIRS), sets))
    same(written, Study.from_toml(BASE + HEIRS, sets))


LINES = [
    'fwhm = "4(1) kHz"',
    'fwhm = "2 kHz ×/ 2"',
    'hwhm = "3 kHz"',
    'frequency = "30 THz ± 1 %"',
    'profile = "gaussian"',
]
SCANS = [
    'snr = "40"',
    "points = 30",
    'span = "4 FWHM"',
    'span = "50 kHz"',
    "free = []",
    'free = ["width"]',
    'time = "1 .. 2 s log"',
]
OTHERS = [
    'kind = "quoted", uncertainty = "0.5 Hz", after = "1 h"',
    'kind = "ramsey", free_time = "9 ms", contrast = "0.6(1)", molecules = "400"',
]
SAMPLES = ['ee_b = "0.5"', 'mass = "1(0.1) g"', 'ee_a = "@beam.samples.ee_b"']
ENTRIES = [
    'pressure = { size = "1 mHz" }',
    'new = { size = "1e-6", on = "width", averages = "never" }',
    'asymmetry = { group = "g" }',
]
DROPPED = ["systematics.asymmetry", "systematics.pressure", "systematics", "samples"]


def some(lines: list[str]) -> st.SearchStrategy[str]:
    """A table with some of the lines, each key once."""
    return st.lists(
        st.sampled_from(lines), max_size=3, unique_by=lambda line: line.split(" = ")[0].replace("hwhm", "fwhm")
    ).map(lambda chosen: "{ " + ", ".join(chosen) + " }")


@st.composite
def families(draw: st.DrawFn) -> str:
    """Scenarios that each override something of an earlier one."""
    text, names = "", ["beam"]
    for name in ("a", "b", "c", "4d")[: draw(st.integers(1, 4))]:
        text += f'[scenario.{name}]\nbased_on = "{draw(st.sampled_from(names))}"\n'
        text += f"line = {draw(some(LINES))}\nsamples = {draw(some(SAMPLES))}\n"
        if name == "a":
            text += f"without = {draw(st.lists(st.sampled_from(DROPPED[:2]), unique=True))!r}\n".replace("'", '"')
            text += f"technique = {draw(some(SCANS))}\n"
        elif draw(st.booleans()):
            text += f"technique = {{ {draw(st.sampled_from(OTHERS))} }}\n"
        if draw(st.booleans()):
            text += 'splitting = { value = "1(1) Hz", of = "one enantiomer" }\n'
        if draw(st.booleans()):
            text += 'schedule = { hours_per_day = 8 }\nswitching = { mode = "simultaneous" }\n'
        names.append(name)
    return text


@settings(max_examples=40, deadline=None)
@given(families())
def test_every_family_resolves_to_itself(text: str) -> None:
    written = study(text)
    again = Study.from_toml(resolve(written))
    same(written, again)
    same(written, Study.from_dict(tomllib.loads(BASE + text)))


# from Python


def test_hostile_dictionaries() -> None:
    deep: dict[str, Any] = {}
    for _ in range(10**4):
        deep = {"a": deep}
    round_and_round: dict[str, Any] = {}
    round_and_round["a"] = round_and_round
    good = tomllib.loads(BASE)
    for wrong in (
        {"shared": deep},
        {"shared": round_and_round},
        {1: 2},
        {"shared": {1: "2"}},
        {"scenario": {1: {}}},
        {"goal": None},
        {"shared": {"x": 10**5000}},
    ):
        with pytest.raises(StudyError):
            Study.from_dict({**good, **wrong})


def test_a_dictionary_is_not_changed() -> None:
    content, before = tomllib.loads(BASE + HEIRS), tomllib.loads(BASE + HEIRS)
    Study.from_dict(content, (("beam.splitting", "3 Hz"), ("beam.line.fwhm.note", "x")))
    assert content == before


def test_whole_numbers_of_thousands_of_digits_in_a_file() -> None:
    """Python itself refuses to read them: our own error all the same, at their line."""
    ((line, _, words),) = faults("[scenario.child]\nbased_on = 1" + "0" * 5000 + "\n")
    assert line == FIRST_OF_MORE + 1
    assert "digits" in words


def test_a_hash_sees_what_matters_only() -> None:
    first = study_hash(study(HEIRS))
    assert study_hash(Study.from_toml("# a comment\n" + BASE.replace(" = ", "  =  ") + HEIRS)) == first
    assert study_hash(Study.from_toml(BASE.replace('"2 s"', '"3 s"') + HEIRS)) != first
