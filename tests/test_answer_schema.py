"""The JSON of assess and compare against its schema, judged by an independent validator."""

from __future__ import annotations

import json
import re
from collections.abc import Callable, Iterator
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
MEASURE = 'kind = "measure"\nrelative_uncertainty = 0.1\nwithin = "30 d"'
RAMSEY = 'kind = "ramsey", free_time = "0.1 s", contrast = 0.8, molecules = "1e3 ×/ 1.4"'
QUOTED = 'kind = "quoted", uncertainty = "3 Hz", after = "1 h"'
FLOOR = 'systematics.floor = { size = "1 Hz", averages = "never" }'
ODD = {
    "exact": (DETECT, "1 Hz", QUOTED, ""),
    "exactly zero": (DETECT, "0 Hz", RAMSEY, ""),
    "unreachable": (DETECT, "1e-6 Hz ×/ 2", RAMSEY, FLOOR),
    "exact and unreachable": (DETECT, "1 mHz", QUOTED, FLOOR),
    "half of it reachable": (DETECT, "1 Hz ×/ 1.2", RAMSEY, FLOOR.replace('1 Hz"', '0.159 Hz"')),
    "not always ready in time": (DETECT.replace("30 d", "3 s"), "1 mHz ×/ 3", RAMSEY.replace("0.1 s", "1 s ×/ 1.5"), ""),
    "supply ends": (DETECT, "1e-6 Hz ×/ 3", RAMSEY, 'samples = { mass = "1 mg", consumption = "5 mg/h" }'),
    "nothing ready in time": (DETECT.replace("30 d", "1 s"), "1 mHz ×/ 3", RAMSEY.replace("0.1 s", "10 s"), ""),
    "range over zero": (DETECT, "-1 .. 2 Hz", RAMSEY, ""),
    "both signs": (DETECT, "0(1) Hz", RAMSEY, ""),
    "negative": (DETECT, "-2.0(1) Hz", RAMSEY, ""),
    "measure": (MEASURE, "1.0(2) Hz", RAMSEY, ""),
    "measure, purity not known": (MEASURE.replace("0.1", "0.01"), "1.0(2) Hz", RAMSEY, "samples = { ee_a = 0.9, ee_b = 0.9, ee_known_to = 0.2 }"),
    "exclude": ('kind = "exclude"\npower = 0.9\nlimit = "1 Hz"\nwithin = "30 d"', "1.0(2) Hz", RAMSEY, ""),
    "sign": ('kind = "sign"\nsignificance = 3\npower = 0.9\nwithin = ["3 d", "30 d"]', "1 Hz ×/ 2", RAMSEY, ""),
    "list": (DETECT.replace('"30 d"', '["1 d", "30 d"]'), "1 Hz ×/ 2", RAMSEY, ""),
    "frequency": (DETECT, "1 Hz ×/ 2", RAMSEY, 'line = { frequency = "30 THz" }'),
}  # fmt: skip
ENSEMBLES = """
[goal]
kind = "detect"
significance = 5
power = 0.9
within = ["1 d", "30 d"]
[scenario.x]
splitting = { values = { HF = "1e-9 Hz", unit = "30(5) mHz", "σ\\u001b" = "20 mHz" }, of = "difference" }
technique = { kind = "ramsey", free_time = "0.1 s", contrast = 0.8, molecules = "1e3 ×/ 1.4" }
systematics.floor = { size = "1 mHz ×/ 2", averages = "never" }
[scenario.y]
based_on = "x"
technique = { free_time = "0.2 s" }
[scenario.z]
based_on = "x"
systematics.floor = { size = "1 Hz ×/ 2" }
"""


def odd_study(name: str) -> str:
    goal, splitting, technique, more = ODD[name]
    return BASE.format(goal=goal, splitting=splitting, technique=technique, more=more)


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


@pytest.fixture(scope="module")
def answers() -> dict[str, Any]:
    """Every odd study by both methods, as a strict reader of the JSON sees it."""
    found = {}
    for method in ("lattice", "monte-carlo"):
        options = Options(tolerance=10.0, method=method, maximum_points=1024)
        for name in ODD:
            result = assess(problem_of(load_study(odd_study(name))), options)
            found[f"{name}, {method}"] = read_back(to_json(assessment_content(result)))
        compared = compare(problem_of(load_study(ENSEMBLES)), options=options)
        found[f"ensembles, {method}"] = read_back(to_json(comparison_content(compared)))
    return found


def test_odd_studies_validate(answers: dict[str, Any]) -> None:
    for name, answer in answers.items():
        (COMPARE if name.startswith("ensembles") else ASSESS).validate(answer)
    assert "unit" in answers["ensembles, lattice"]["scenarios"][0]["chance"]["per_calculation"]


def test_an_unreachable_study_says_never(answers: dict[str, Any]) -> None:
    one = answers["exact and unreachable, lattice"]["scenarios"][0]
    assert one["status"] == "unreachable"
    assert one["required_time"]["q50"] is None
    assert one["required_time"]["reachable"] == 0


def nulls(content: Any, path: str = "") -> Iterator[str]:
    """Addresses of what is null; names of calculations and scenarios, and places in lists, are *."""
    if content is None:
        yield path
    elif isinstance(content, dict):
        named = path.endswith(("per_calculation", "texts", "sigma.shares"))
        for key, value in content.items():
            one_for_all = path.endswith(".error") and key in ("q05", "q16", "q50", "q84", "q95")
            yield from nulls(value, f"{path}.{'*' if named or one_for_all else key}")
    elif isinstance(content, list):
        for value in content:
            yield from nulls(value, f"{path}.*")


def parts(schema: dict[str, Any], path: str = "") -> Iterator[tuple[str, dict[str, Any]]]:
    """Every schema within a schema with its address."""
    yield path, schema
    for key, inner in schema.get("properties", {}).items():
        yield from parts(inner, f"{path}.{key}")
    for inner in (schema.get("items"), schema.get("additionalProperties")):
        if isinstance(inner, dict):
            yield from parts(inner, f"{path}.*")
    for inner in schema.get("anyOf", ()):
        yield from parts(inner, path)


def test_null_is_allowed_where_it_occurs_and_nowhere_else(answers: dict[str, Any]) -> None:
    """One place is allowed that no technique of today uses: DESIGN promises it to the ones to come."""
    allowed = {
        re.sub(r"(\.error\.)q\d\d$", r"\1*", path)
        for path, schema in parts(compare_schema())
        if schema.get("type") == "null"
        or "null" in (schema.get("type") if isinstance(schema.get("type"), list) else ())
    }
    seen = {path for answer in answers.values() for path in nulls(answer)}
    assert allowed - seen == {".scenarios.*.sensitivity"}
    assert seen <= allowed


@pytest.mark.parametrize("make", FILES.values(), ids=list(FILES))
def test_everything_is_described_and_closed(make: Callable[[], dict[str, Any]]) -> None:
    for path, schema in parts(make()):
        if schema.get("type") == "null":
            continue
        described = schema.get("description", "")
        assert described, path
        assert len(described) < 150, path
        if schema.get("type") == "object" and "properties" in schema:
            assert schema["additionalProperties"] is False, path
        if "const" not in schema and "enum" not in schema:
            assert "type" in schema or "anyOf" in schema, path


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
        lambda answer: answer["question"].update(workers=2),
        lambda answer: answer["question"].update(name="compare"),
        lambda answer: answer["scenarios"][0]["splitting"].update(q50=None),
        lambda answer: answer["scenarios"][0]["splitting"]["error"].pop("q50"),
        lambda answer: answer["scenarios"][0]["required_time"]["error"].update(q99=1.0),
        lambda answer: answer["scenarios"][0]["required_time"].update(clock="live"),
        lambda answer: answer["scenarios"][0]["required_time"].update(q50="3 d"),
        lambda answer: answer["scenarios"][0]["limiting"]["shares"].update(luck=0.1),
        lambda answer: answer["scenarios"][0]["chance"].update(goal_met=1),
        lambda answer: answer["warnings"].append({"code": "x", "address": ""}),
        lambda answer: answer.update(schema_version=1),
        lambda answer: answer.update(scenarios={}),
    ],
)
def test_spoiled_answers_do_not_validate(change: Callable[[dict[str, Any]], Any]) -> None:
    with pytest.raises(ValidationError):
        ASSESS.validate(_spoil(change))


def test_an_answer_of_assess_is_none_of_compare() -> None:
    answer = _spoil(lambda answer: None)
    ASSESS.validate(answer)
    with pytest.raises(ValidationError):
        COMPARE.validate(answer)
