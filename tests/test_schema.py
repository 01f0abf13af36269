"""JSON Schema of the study file, judged by an independent validator."""

from __future__ import annotations

import json
import tomllib
from pathlib import Path
from typing import Any

import pytest
from jsonschema import Draft202012Validator

from pvfeas import problem_of
from pvfeas.keys import keys_of
from pvfeas.schema import FILES, describe, schema_text, study_schema, write_schemas
from pvfeas.starters import starter
from pvfeas.study import Study
from pvfeas.tables import Goal, Line, Samples, Schedule, Switching, Systematic
from pvfeas.techniques import TECHNIQUES
from pvfeas.vocabulary import keys_for

ROOT = Path(__file__).resolve().parent.parent
EXAMPLES = sorted((ROOT / "data" / "studies").glob("*.toml"))
VALID = sorted((ROOT / "tests" / "studies" / "valid").glob("*.toml"))
INVALID = ROOT / "tests" / "studies" / "invalid"
WHOLE, OPTIONAL = Draft202012Validator(study_schema()), Draft202012Validator(study_schema(optional=True))


def read(path: Path) -> dict[str, Any]:
    return tomllib.loads(path.read_text(encoding="utf-8"))


@pytest.mark.parametrize("name", FILES)
def test_shipped_files_are_current(name: str) -> None:
    """If not: write_schemas(Path("data/schema")) of pvfeas.schema brings them up to date."""
    shipped = (ROOT / "data" / "schema" / name).read_text(encoding="utf-8")
    assert shipped == schema_text(FILES[name])
    Draft202012Validator.check_schema(json.loads(shipped))


def test_written_as_shipped(tmp_path: Path) -> None:
    for path in write_schemas(tmp_path):
        assert path.read_bytes() == (ROOT / "data" / "schema" / path.name).read_bytes()


@pytest.mark.parametrize("path", EXAMPLES + VALID, ids=lambda path: path.stem)
def test_good_studies_validate_in_both_views(path: Path) -> None:
    WHOLE.validate(read(path))
    OPTIONAL.validate(read(path))


@pytest.mark.parametrize("kind", sorted(TECHNIQUES))
def test_starters_validate(kind: str) -> None:
    WHOLE.validate(tomllib.loads(starter(kind)))


# What a schema can see: keys, kinds of value, words, bounds of bare numbers, a missing unit.
SEEN = (
    "misspelt_", "unknown_", "later_", "goal_", "scenario_", "splitting_plain", "splitting_without", "splitting_of",
    "technique_", "ramsey_free_time", "quoted_after", "systematic_averages_missing", "systematic_size_missing",
    "per_reset", "as_one_over_t", "grows_", "systematic_grows", "title_is", "one_scenario", "quantity_is_true", "quantity_is_list",
    "number_without_unit", "sides_", "trials_", "looks_", "free_", "based_on_is", "without_is", "power_above",
    "ee_above", "contrast_above", "day_of", "week_of", "one_point", "dof_below", "weights_neg", "ensemble_empty",
    "profile_unknown", "mode_unknown", "status_unknown", "correlation_without", "correlation_above", "fwhm_and_hwhm",
    "measure_without", "value_and_percentiles", "percentile_alone", "difference_of_one", "within_is_empty", "times_is",
)  # fmt: skip
UNSEEN = ("goal_uncertain",)


def seen() -> list[Path]:
    paths = [path for path in sorted(INVALID.glob("*.toml")) if path.stem.startswith(SEEN) and path.stem not in UNSEEN]
    return [path for path in paths if not path.stem.startswith("toml_")]


@pytest.mark.parametrize("path", seen(), ids=lambda path: path.stem)
def test_wrong_studies_do_not_validate(path: Path) -> None:
    assert list(WHOLE.iter_errors(read(path)))


def test_enough_wrong_studies_are_seen() -> None:
    assert len(seen()) >= 80


BASE = """
[goal]
kind = "detect"
significance = 5
power = 0.9
within = "60 d"
[scenario.first]
splitting = { value = "1 Hz", of = "difference" }
technique = { kind = "quoted", uncertainty = "0.5 Hz", after = "1 h" }
[scenario.second]
based_on = "first"
line = { fwhm = "4 kHz" }
"""


def test_children_may_leave_out_anything_and_fragments_too() -> None:
    WHOLE.validate(tomllib.loads(BASE))
    fragment = tomllib.loads('[scenario.pilot]\ntechnique = { snr = "42(5)" }\n')
    OPTIONAL.validate(fragment)
    assert list(WHOLE.iter_errors(fragment))
    orphan = tomllib.loads(BASE.replace('based_on = "first"\n', ""))
    assert list(WHOLE.iter_errors(orphan))


@pytest.mark.parametrize("view", [WHOLE, OPTIONAL], ids=["whole", "optional"])
def test_children_are_checked_for_spelling(view: Draft202012Validator) -> None:
    assert list(view.iter_errors(tomllib.loads(BASE.replace("fwhm", "fwmh"))))
    assert list(view.iter_errors(tomllib.loads(BASE.replace("[goal]", "[goal]\nsignifcance = 3"))))


@pytest.mark.parametrize("kind", sorted(TECHNIQUES))
def test_every_misspelt_technique_key_is_seen(kind: str) -> None:
    """Spelling of each key of each technique, by generated studies."""
    content = tomllib.loads(starter(kind))
    for name in keys_of(TECHNIQUES[kind]):
        technique = dict(content["scenario"]["first"]["technique"])
        technique[name + "x"] = technique.pop(name, 1)
        wrong = content | {"scenario": {"first": content["scenario"]["first"] | {"technique": technique}}}
        assert list(WHOLE.iter_errors(wrong)), name
        assert list(OPTIONAL.iter_errors(wrong)), name


def test_every_key_is_described_as_declared() -> None:
    text = schema_text()
    for table, part in (
        ("goal", Goal), ("line", Line), ("samples", Samples), ("schedule", Schedule), ("switching", Switching),
        ("systematics", Systematic),
    ):  # fmt: skip
        for name in keys_of(part):
            if name != "name":
                assert json.dumps(describe(keys_for(table)[name]), ensure_ascii=False) in text, (table, name)
    for kind in TECHNIQUES:
        for key in keys_for("technique", kind).values():
            assert json.dumps(describe(key), ensure_ascii=False) in text


@pytest.mark.parametrize("path", EXAMPLES, ids=lambda path: path.stem)
def test_what_validates_loads_from_python_too(path: Path) -> None:
    assert problem_of(Study.from_dict(read(path))).scenarios
