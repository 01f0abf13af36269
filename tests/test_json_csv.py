"""JSON and CSV carry the same numbers, with units, and nothing that steers a terminal or breaks a reader."""

from __future__ import annotations

import csv
import io
import json
import math
import unicodedata
from collections.abc import Iterator
from typing import Any

import pytest
from hypothesis import given
from hypothesis import strategies as st

from pvfeas.compiler import problem_of
from pvfeas.options import Options
from pvfeas.output.csv import assessment_csv, to_csv
from pvfeas.output.json import assessment_content, comparison_content, rounded, to_json
from pvfeas.output.words import escaped, spelt_out
from pvfeas.questions.assess import assess
from pvfeas.questions.compare import compare
from pvfeas.resolving import resolve, study_hash
from pvfeas.studyfile import load_study

STUDY = """
title = "red \\u001b[31m, \\u009b2J, \\u202e, \\u2028, \\u007f, σ and \\U0001F600"
[goal]
kind = "detect"
significance = 5
power = 0.9
within = ["5 d", "20 d"]
[scenario.one]
splitting = { values = { unit = "20 mHz", reachable = "30(5) mHz", "a, \\"b\\"\\u001b[2J\\n" = "25 mHz" }, times = ["1 ×/ 1.5"], of = "difference" }
technique = { kind = "ramsey", free_time = "0.1 s", contrast = 0.8, molecules = "20 ×/ 1.5" }
line = { frequency = "30 THz" }
samples = { mass = "1 g", consumption = "5 mg/h" }
systematics.unit = { size = "2 mHz ×/ 1.5", averages = "never" }
[scenario.two]
based_on = "one"
without = ["line.frequency", "systematics.unit"]
"""
NEVER = """
[goal]
kind = "measure"
relative_uncertainty = 0.1
within = "5 d"
[scenario.never]
splitting = { value = "1e-9 Hz ×/ 2", of = "difference" }
technique = { kind = "quoted", uncertainty = "3 Hz ×/ 1.2", after = "1 h" }
systematics.floor = { size = "1 Hz", averages = "never" }
[scenario.soon]
based_on = "never"
splitting = { value = "0.5 Hz ×/ 2", of = "difference" }
technique = { kind = "ramsey", free_time = "0.1 s", contrast = 0.8, molecules = "20 ×/ 1.5" }
without = ["systematics.floor"]
"""
FAST = Options(tolerance=30.0)
READ = load_study(STUDY)
RESULT = assess(problem_of(READ), FAST)
CONTENT = json.loads(to_json(assessment_content(RESULT)))
ROWS = list(csv.reader(io.StringIO(assessment_csv(RESULT))))
NO_UNIT = {"", "1"}


def steering(text: str) -> set[str]:
    return {sign for sign in text if sign != "\n" and unicodedata.category(sign) in ("Cc", "Cf", "Cs", "Zl", "Zp")}


def numbers(content: Any, path: tuple[str, ...] = (), unit: str = "") -> Iterator[tuple[tuple[str, ...], Any, str]]:
    """Every number or null of the JSON with its address and the unit its table states; names are no units."""
    if isinstance(content, dict):
        named = path[-1:] in (("per_calculation",), ("shares",))
        unit = content["unit"] if "unit" in content and not named else unit
        for key, value in content.items():
            if key != "unit" or named:
                yield from numbers(value, (*path, key), unit)
    elif isinstance(content, list):
        for place, value in enumerate(content, start=1):
            if not isinstance(value, str):
                yield from numbers(value, (*path, str(place)), "")
    else:
        yield path, content, unit


PURE = {"reachable", "in_time", "confidence", "u_ln"}  # probabilities and logarithms beside times and frequencies


def unit_of(path: tuple[str, ...], value: Any, unit: str) -> str:
    pure = path[-1] in PURE and path[-2] not in ("per_calculation",)
    return "" if pure or "shares" in path or isinstance(value, str | bool) or unit in NO_UNIT else unit


@pytest.mark.parametrize("study", [STUDY, NEVER], ids=["ensembles", "never"])
def test_every_number_of_the_json_is_in_the_csv_with_its_unit(study: str) -> None:
    result = assess(problem_of(load_study(study)), FAST)
    content = json.loads(to_json(assessment_content(result)))
    header, *rows = csv.reader(io.StringIO(assessment_csv(result)))
    assert len(set(header)) == len(header)
    for row, one in zip(rows, content["scenarios"], strict=True):
        cells = dict(zip(header, row, strict=True))
        assert cells["scenario"] == one["name"]
        told = [found for found in numbers(one) if found[0] != ("name",)]
        assert len(told) > 100
        for path, value, unit in told:
            own = unit_of(path, value, unit)
            name = spelt_out(".".join(path)) + (f" ({own})" if own else "")
            if value is None:  # of a table that is null as a whole the name has no unit
                assert cells.get(name, "") == ""
            elif isinstance(value, bool):
                assert cells[name] == str(value).lower()
            elif isinstance(value, int | float):
                assert float(cells[name]) == value  # both are rounded to nine digits, so exactly
            else:
                assert cells[name] == value


def test_no_column_of_the_csv_is_unknown_to_the_json() -> None:
    known = {spelt_out(".".join(path)) for one in CONTENT["scenarios"] for path, _, _ in numbers(one)}
    known |= {"scenario", "chance.at_each", "not_applicable", "pvfeas", "question", "study_sha256"}
    for name in ROWS[0]:
        bare = name.rsplit(" (", 1)[0] if name.endswith(")") else name
        assert bare in known, name


def test_names_like_our_own_words_are_names() -> None:
    assert "required_time.per_calculation.unit (s)" in ROWS[0]
    assert "required_time.per_calculation.reachable (s)" in ROWS[0]
    assert "chance.per_calculation.unit" in ROWS[0]
    assert "sigma.shares.systematics.unit" in ROWS[0]
    assert "required_time.reachable" in ROWS[0]


def test_nothing_steers_the_terminal_and_nothing_is_lost() -> None:
    for text in (to_json(assessment_content(RESULT)), assessment_csv(RESULT)):
        assert steering(text) == set()
    assert CONTENT["study"]["title"] == READ.title
    assert 'a, "b"\x1b[2J\n' in CONTENT["scenarios"][0]["chance"]["per_calculation"]
    assert r'chance.per_calculation.a, "b"\x1b[2J\n' in ROWS[0]


@pytest.mark.parametrize("encoding", ["ascii", "cp1252", "utf-8"])
def test_escapes_say_the_same(encoding: str) -> None:
    written = escaped(to_json(assessment_content(RESULT)), encoding, "json")
    assert json.loads(written.encode(encoding)) == CONTENT
    toml = escaped(resolve(READ), encoding, "toml")
    assert steering(toml) == set()
    assert study_hash(load_study(toml.encode(encoding).decode(encoding))) == study_hash(READ)


@given(st.text())
def test_any_text_comes_back(text: str) -> None:
    """Lone surrogates cannot come from a file, which is UTF-8; hypothesis leaves them out."""
    import tomllib

    written = escaped(json.dumps({"x": text}, ensure_ascii=False), "ascii", "json")
    assert written.isascii()
    assert json.loads(written) == {"x": text}
    basic = json.dumps(text, ensure_ascii=False)  # a JSON string is a TOML string but for DEL
    assert tomllib.loads(escaped(f"x = {basic}", "ascii", "toml")) == {"x": text}
    assert steering(spelt_out(text)) == set()
    assert "\n" not in spelt_out(text)
    (head,), (cell,) = csv.reader(io.StringIO(to_csv([{"x": text or "-"}])))
    assert (head, cell) == ("x", spelt_out(text or "-"))


def walk(content: Any) -> Iterator[Any]:
    if isinstance(content, dict):
        for value in content.values():
            yield from walk(value)
    elif isinstance(content, list):
        for value in content:
            yield from walk(value)
    else:
        yield content


def test_numbers_are_finite_and_have_nine_digits() -> None:
    for content in (CONTENT, comparison_content(compare(problem_of(READ), options=FAST))):
        found = [value for value in walk(content) if isinstance(value, float)]
        assert found
        for value in found:
            assert math.isfinite(value)
            assert value == float(f"{value:.9g}")


@given(st.floats(allow_nan=False))
def test_rounding(value: float) -> None:
    found = rounded(value)
    if math.isinf(value):
        assert found is None
    elif found is None:
        assert abs(value) > 1.79e308  # rounds up to beyond the largest number
    else:
        assert abs(found - value) <= 0.5e-8 * abs(value) + 5e-324  # half a unit of the ninth digit


@pytest.mark.parametrize("value", [float("nan"), float("inf"), float("-inf")])
def test_what_is_not_finite_is_refused(value: float) -> None:
    with pytest.raises(ValueError, match="JSON"):
        to_json({"x": value})


def test_rows_of_different_columns() -> None:
    """Columns in order of appearance; what a row does not have is empty; quotes as csv has them."""
    text = to_csv([{"a": 1.0, "b": True}, {"b": None, "c": 'say "x", y'}], {"end": "z"})
    assert text == 'a,b,c,end\n1,true,,z\n,,"say ""x"", y",z\n'
