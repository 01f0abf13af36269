"""based_on, without, --set and resolve: what is shared, what is replaced, what comes back."""

from __future__ import annotations

from pathlib import Path

import pytest

from pvfeas import Options, Study, StudyError, assess, load_study, problem_of, resolve
from pvfeas.output.json import assessment_content, to_json
from pvfeas.resolving import study_hash

STUDIES = Path(__file__).resolve().parent.parent / "data" / "studies"
FAST = Options(tolerance=30.0)
BASE = """
title = "Inheritance (invented)"
[goal]
kind = "detect"
significance = 5
power = 0.9
within = "60 d"
[shared]
theory = "1 ×/ 1.6"
[scenario.a]
splitting = { value = "50 mHz", times = ["@theory"], of = "difference", source = "a calculation", status = "assumed" }
line = { frequency = "29 THz" }
[scenario.a.technique]
kind = "ramsey"
free_time = "0.1 s"
contrast = { value = "0.8(1)", source = "a test", status = "measured" }
molecules = "200 ×/ 1.5"
[scenario.a.systematics]
stray = { size = "1 mHz ×/ 1.5", averages = "never" }
light = { size = "2 mHz", averages = "as 1/t", after = "1 h" }
"""


def inputs(text: str) -> list[str]:
    return [one.address for one in problem_of(load_study(text)).inputs]


def test_what_is_not_overridden_is_the_same_input() -> None:
    found = inputs(BASE + '[scenario.b]\nbased_on = "a"\ntechnique = { molecules = "300 ×/ 1.5" }\n')
    assert "a.technique.contrast" in found
    assert "b.technique.contrast" not in found
    assert "b.technique.molecules" in found


def test_quantities_written_twice_are_independent() -> None:
    found = inputs(BASE + '[scenario.b]\nbased_on = "a"\ntechnique = { contrast = "0.8(1)" }\n')
    assert {"a.technique.contrast", "b.technique.contrast"} <= set(found)


def test_an_identical_child_has_identical_answers() -> None:
    problem = problem_of(load_study(BASE + '[scenario.b]\nbased_on = "a"\n'))
    one, other = assess(problem, FAST).scenarios
    assert one.required_time == other.required_time
    assert one.chance.value == pytest.approx(other.chance.value, abs=one.chance.error + other.chance.error)


def test_a_leaf_is_replaced_whole_with_its_source() -> None:
    study = load_study(BASE + '[scenario.b]\nbased_on = "a"\ntechnique = { contrast = "0.5" }\n')
    contrast = study.scenario["b"].technique.quantities["contrast"].quantity
    assert (contrast.source, contrast.status) == ("", "")


def test_another_kind_replaces_the_table() -> None:
    child = 'technique = { kind = "quoted", uncertainty = "0.1 Hz", after = "1 h" }'
    study = load_study(BASE + f'[scenario.b]\nbased_on = "a"\n{child}\n')
    assert set(study.scenario["b"].technique.quantities) == {"uncertainty", "after"}


def test_without_drops_entries() -> None:
    text = BASE + '[scenario.b]\nbased_on = "a"\nwithout = ["systematics.light"]\n'
    assert set(load_study(text).scenario["b"].systematics) == {"stray"}
    assert set(load_study(text).scenario["a"].systematics) == {"stray", "light"}


def test_chains_and_order_of_writing() -> None:
    text = BASE + '[scenario.c]\nbased_on = "b"\n[scenario.b]\nbased_on = "a"\ntechnique = { free_time = "0.2 s" }\n'
    problem = problem_of(load_study(text))
    times = {one.name: one for one in problem.scenarios}
    assert times["c"].technique_a == times["b"].technique_a
    assert times["c"].technique_a != times["a"].technique_a


@pytest.mark.parametrize(
    "more",
    ['[scenario.b]\nbased_on = "b"\n', '[scenario.b]\nbased_on = "c"\n[scenario.c]\nbased_on = "b"\n'],
)
def test_cycles_are_named(more: str) -> None:
    with pytest.raises(StudyError) as caught:
        load_study(BASE + more)
    assert "b" in str(caught.value)
    assert "based_on" in str(caught.value)


def test_settings_act_before_inheritance() -> None:
    text = BASE + '[scenario.b]\nbased_on = "a"\n'
    problem = problem_of(load_study(text, [("a.technique.free_time", "0.3 s")]))
    one, other = problem.scenarios
    assert one.technique_a == other.technique_a
    study = load_study(text, [("a.technique.contrast", "0.6")])
    contrast = study.scenario["a"].technique.quantities["contrast"].quantity
    assert (contrast.source, contrast.status) == ("command line", "assumed")


@pytest.mark.parametrize("path", sorted(STUDIES.glob("*.toml")), ids=lambda path: path.stem)
def test_resolved_studies_read_back_to_the_same_answer(path: Path) -> None:
    study = load_study(path)
    text = resolve(study)
    again = load_study(text)
    assert resolve(again) == text
    assert study_hash(again) == study_hash(study)
    assert "based_on" not in text
    answers = [to_json(assessment_content(assess(problem_of(one), FAST))) for one in (study, again)]
    assert answers[0] == answers[1]


def test_the_same_from_python() -> None:
    import tomllib

    path = STUDIES / "beam-line-scan.toml"
    text = path.read_text(encoding="utf-8")
    studies = [load_study(path), Study.from_toml(text), Study.from_dict(tomllib.loads(text))]
    assert len({study_hash(one) for one in studies}) == 1
    answers = {to_json(assessment_content(assess(problem_of(one), FAST))) for one in studies}
    assert len(answers) == 1


def test_a_hash_sees_what_matters_only() -> None:
    text = BASE + '[scenario.b]\nbased_on = "a"\n'
    first = study_hash(load_study(text))
    assert study_hash(load_study("# a comment\n" + text)) == first
    assert study_hash(load_study(text.replace("0.1 s", "0.2 s"))) != first
