"""The JSON of assess and compare against its schema, judged by an independent validator."""

from __future__ import annotations

import json
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest
from jsonschema import Draft202012Validator, ValidationError

from pvfeas.compiler import problem_of
from pvfeas.options import Options
from pvfeas.output.answer_schema import FILES, answer_schema_text, assess_schema, compare_schema
from pvfeas.output.json import assessment_content, comparison_content, to_json
from pvfeas.questions.assess import assess
from pvfeas.questions.compare import compare
from pvfeas.studyfile import load_study

DATA = Path(__file__).resolve().parent.parent / "data"
EXAMPLES = sorted((DATA / "studies").glob("*.toml"))
ASSESS, COMPARE = Draft202012Validator(assess_schema()), Draft202012Validator(compare_schema())
FAST = Options(tolerance=10.0)

BASE = """
[goal]
{goal}
[scenario.x]
splitting = {{ value = "{splitting}", of = "difference" }}
technique = {{ {technique} }}
{more}
"""
DETECT = 'kind = "detect"\nsignificance = 5\npower = 0.9\nwithin = "30 d"'
RAMSEY = 'kind = "ramsey", free_time = "0.1 s", contrast = 0.8, molecules = "{} ×/ 1.4"'.format("1e3")
ODD = {
    "exact": (DETECT, "1 Hz", 'kind = "quoted", uncertainty = "3 Hz", after = "1 h"', ""),
    "unreachable": (
        DETECT, "1e-6 Hz ×/ 2", RAMSEY, 'systematics.floor = { size = "1 Hz", averages = "never" }',
    ),
    "both signs": (DETECT, "0(1) Hz", RAMSEY, ""),
    "negative": (DETECT, "-2.0(1) Hz", RAMSEY, ""),
    "measure": ('kind = "measure"\nrelative_uncertainty = 0.1\nwithin = "30 d"', "1.0(2) Hz", RAMSEY, ""),
    "exclude": ('kind = "exclude"\npower = 0.9\nlimit = "1 Hz"\nwithin = "30 d"', "1.0(2) Hz", RAMSEY, ""),
    "sign": ('kind = "sign"\nsignificance = 3\npower = 0.9\nwithin = ["3 d", "30 d"]', "1 Hz ×/ 2", RAMSEY, ""),
    "list": (DETECT.replace('"30 d"', '["1 d", "30 d"]'), "1 Hz ×/ 2", RAMSEY, ""),
    "frequency": (DETECT, "1 Hz ×/ 2", RAMSEY, 'line = { frequency = "30 THz" }'),
}  # fmt: skip


def read_back(text: str) -> Any:
    """What a strict reader sees: NaN and Infinity are no JSON."""

    def refuse(name: str) -> None:
        raise AssertionError(f"{name} in JSON")

    return json.loads(text, parse_constant=refuse)


@pytest.mark.parametrize("name", FILES)
def test_shipped_files_are_current(name: str) -> None:
    """If not: write_answer_schemas(Path("data/schema")) of pvfeas.output.answer_schema brings them up to date."""
    shipped = (DATA / "schema" / name).read_text(encoding="utf-8")
    assert shipped == answer_schema_text(name)
    Draft202012Validator.check_schema(json.loads(shipped))


@pytest.mark.parametrize("path", EXAMPLES, ids=lambda path: path.stem)
def test_examples_validate(path: Path) -> None:
    problem = problem_of(load_study(str(path)))
    ASSESS.validate(read_back(to_json(assessment_content(assess(problem, FAST)))))
    COMPARE.validate(read_back(to_json(comparison_content(compare(problem, options=FAST)))))


@pytest.mark.parametrize("name", ODD)
@pytest.mark.parametrize("method", ["lattice", "monte-carlo"])
def test_odd_studies_validate(name: str, method: Any) -> None:
    goal, splitting, technique, more = ODD[name]
    text = BASE.format(goal=goal, splitting=splitting, technique=technique, more=more)
    options = Options(tolerance=10.0, method=method, maximum_points=1024)
    ASSESS.validate(read_back(to_json(assessment_content(assess(problem_of(load_study(text)), options)))))


def _spoil(change: Callable[[dict[str, Any]], Any]) -> dict[str, Any]:
    answer = assessment_content(assess(problem_of(load_study(str(EXAMPLES[0]))), FAST))
    change(answer)
    return answer


@pytest.mark.parametrize(
    "change",
    [
        lambda answer: answer.pop("seed"),
        lambda answer: answer.update(extra=1),
        lambda answer: answer["scenarios"][0]["chance"].update(value=1.5),
        lambda answer: answer["scenarios"][0]["reach"].update(unit="kHz"),
        lambda answer: answer["scenarios"][0]["required_time"].pop("reachable"),
        lambda answer: answer["scenarios"][0].update(status="perhaps"),
        lambda answer: answer["scenarios"][0].update(sigma=None),
        lambda answer: answer["study"].update(sha256="12"),
    ],
)
def test_spoiled_answers_do_not_validate(change: Callable[[dict[str, Any]], Any]) -> None:
    with pytest.raises(ValidationError):
        ASSESS.validate(_spoil(change))
