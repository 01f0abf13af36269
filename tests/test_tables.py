"""Text, CSV and JSON say the same, line up, and carry nothing that could steer a terminal."""

from __future__ import annotations

import csv
import io
import json
from dataclasses import replace
from typing import Any

import pytest
from hypothesis import given
from hypothesis import strategies as st
from rich.cells import cell_len

from pvfeas.compiler import problem_of
from pvfeas.options import Options
from pvfeas.output.csv import assessment_csv, curves_csv
from pvfeas.output.grid import fits, fold, grid
from pvfeas.output.json import assessment_content, rounded, to_json
from pvfeas.output.table import assessment_text, comparison_text, understood_text
from pvfeas.output.words import encodable, error_text, exact_time, range_text, share, short
from pvfeas.questions.assess import assess
from pvfeas.questions.compare import compare
from pvfeas.questions.curves import curves
from pvfeas.results import Difference
from pvfeas.studyfile import load_study
from pvfeas.understanding import differences, understood

FAST = Options(tolerance=30.0)
STUDY = """
title = "Names \\u001b[31mred\\u0007 and long ones"
[goal]
kind = "detect"
significance = 5
power = 0.9
within = ["5 d", "20 d"]
[scenario.the_first_apparatus_with_helium]
splitting = { values = { HF = "20 mHz", CC = "30(5) mHz" }, times = ["1 ×/ 1.5"], of = "difference", source = "a \\u001b[2J calculation" }
technique = { kind = "ramsey", free_time = "0.1 s", contrast = 0.8, molecules = "20 ×/ 1.5" }
samples = { mass = "1 g", consumption = "5 mg/h" }
systematics.stray = { size = "2 mHz ×/ 1.5", averages = "never" }
"""
MORE = "".join(
    f'[scenario.way_{i}_with_quite_a_long_name]\nbased_on = "the_first_apparatus_with_helium"\ntechnique = {{ free_time = "{20 * i} ms" }}\n'
    for i in range(1, 5)
)
PROBLEM = problem_of(load_study(STUDY + MORE))
RESULT = assess(PROBLEM, FAST)


@pytest.mark.parametrize("width", [60, 80, 120])
def test_text_fits_and_lines_up(width: int) -> None:
    text = comparison_text(compare(PROBLEM, options=FAST), width)
    assert max(len(line) for line in text.splitlines()) <= max(width, 75)  # one column beside the labels is never cut
    for block in text.split("\n\n"):
        lines = block.splitlines()
        rule = next((line for line in lines if set(line) <= {"─", " "} and line.strip()), None)
        if rule:
            starts = {len(line) - len(line.lstrip()) for line in lines}
            assert starts <= {0, 2} | {len(lines[0]) - len(lines[0].lstrip())}


def test_columns_start_alike() -> None:
    text = grid(["", "one", "two"], [["a", "1 Hz", "22222 Hz"], ["bbb", "333 Hz", "4"]], 80)
    lines = text.splitlines()
    assert lines[0].index("one") == lines[2].index("1 Hz") == lines[3].index("333")
    assert lines[0].index("two") == lines[2].index("22222") == lines[3].index("4")
    assert fits(["", "one"], [["a", "b"]], 80)
    assert not fits(["", "one", "two"], [["a", "b" * 50, "c" * 50]], 80)


@pytest.mark.parametrize("colour", [False, True])
def test_nothing_steers_the_terminal(colour: bool) -> None:
    for text in (assessment_text(RESULT, 80, colour), understood_text(understood(load_study(STUDY)), 80, colour)):
        bare = text.replace("\x1b[1m", "").replace("\x1b[0m", "")
        assert not any(ord(sign) < 32 and sign != "\n" for sign in bare)
        assert "red" in bare


def test_the_verdict_comes_first_and_the_caution_last() -> None:
    lines = assessment_text(RESULT).split("\n\n")
    assert lines[1].startswith("the_first_apparatus_with_helium: chance")
    assert "safety review" in lines[-1]


def flat(content: Any, path: str = "") -> dict[str, Any]:
    if isinstance(content, dict):
        return {
            k: v for key, value in content.items() for k, v in flat(value, f"{path}.{key}" if path else key).items()
        }
    return {path: content}


def test_csv_is_the_json() -> None:
    rows = list(csv.DictReader(io.StringIO(assessment_csv(RESULT))))
    content = json.loads(to_json(assessment_content(RESULT)))
    assert len(rows) == len(content["scenarios"]) == 5
    for row, one in zip(rows, content["scenarios"], strict=True):
        bare = {key.split(" (")[0]: value for key, value in row.items()}
        for address in ("required_time.q50", "chance.value", "reach.q84", "sigma.total.q50", "contract.looks"):
            value = flat(one)[address]
            assert bare[address] == (
                "" if value is None else f"{value:.9g}" if isinstance(value, float) else str(value)
            )
    assert "required_time.q50 (s)" in rows[0]
    assert "chance.value" in rows[0]
    assert "reach.q84 (Hz)" in rows[0]


def test_nine_digits_and_no_nan() -> None:
    assert rounded(1.23456789012345) == 1.23456789
    assert rounded(float("inf")) is None
    with pytest.raises(ValueError, match="NaN"):
        rounded(float("nan"))


def test_curves_as_csv() -> None:
    found = curves(PROBLEM, (), FAST)
    rows = list(csv.DictReader(io.StringIO(curves_csv(found, {"name": "assess"}, "0" * 64))))
    first = [row for row in rows if row["scenario"] == found.sigma[0].scenario and row["curve"] == "sigma"]
    assert [float(row["value"]) for row in first] == pytest.approx(found.sigma[0].total, rel=1e-8)  # nine digits
    assert {row["unit"] for row in first} == {"Hz"}
    assert {row["study_sha256"] for row in rows} == {"0" * 64}


@pytest.mark.parametrize(
    ("made", "expected"),
    [
        (share(0.0), "0 %"), (share(1.0), "100 %"), (share(0.0004), "< 0.1 %"), (share(0.9996), "> 99.9 %"), (share(0.123), "12.3 %"),
        (short("1.2e+14"), "1.2e14"), (short("5.7e-07"), "5.7e-7"), (exact_time(86400.0 * 60), "60 d"),
        (error_text(0.00041), "0.05 %"), (error_text(0.0), "0 %"), (error_text(None), "-"), (error_text(2.0, 100.0), "2 %"),
        (range_text(1.1, 2.57, "Hz"), "1.10 – 2.57 Hz"), (range_text(None, None, "s"), "never"), (range_text(86400.0, None, "s"), "1.00 d – never"),
        (encodable("5 ≥ σ ± 1", "ascii"), "5 >= sigma +/- 1"), (encodable("5 ± 1 ×", "cp1252"), "5 ± 1 ×"),
    ],
)  # fmt: skip
def test_numbers_in_words(made: str, expected: str) -> None:
    assert made == expected


LETTERS = st.text(st.sampled_from("abcXYZ012_-.:, σ重é"), max_size=80)


@given(LETTERS, st.integers(2, 60), st.integers(0, 2))
def test_folding_cuts_nothing(text: str, size: int, hanging: int) -> None:
    lines = fold(text, size, hanging).split("\n")
    assert "".join("".join(lines).split()) == "".join(text.split())
    if cell_len(text) > size >= 6:  # the margin is at most half, and a sign of two columns needs room
        assert max(map(cell_len, lines)) <= size


@given(st.lists(st.lists(LETTERS, min_size=4, max_size=4), min_size=1, max_size=5), st.sampled_from([40, 60, 80, 120]))
def test_any_cells_fit_and_line_up(rows: list[list[str]], width: int) -> None:
    """Each block of columns starts at places that every line of it respects: a blank stands before each."""
    for block in grid(rows[0], rows, width).split("\n\n"):
        lines = block.split("\n")
        assert max(map(cell_len, lines)) <= width


def long_names(size: int) -> str:
    first = "a_scenario_".ljust(size - 1, "x") + "0"
    study = STUDY.replace("the_first_apparatus_with_helium", first).replace(
        "HF =", '"a calculation with each of its approximations named" ='
    )
    return study + "".join(
        f'[scenario.{first[:-1]}{i}]\nbased_on = "{first}"\ntechnique = {{ free_time = "{20 * i} ms", molecules = "{10 * i} ×/ 1.{i}" }}\n'
        for i in range(1, 5)
    )


@pytest.mark.parametrize("size", [20, 30, 45, 64])
def test_five_scenarios_with_long_names_fit(size: int) -> None:
    read = load_study(long_names(size))
    result = compare(problem_of(read), options=FAST, differences=differences(read, list(read.scenario)))
    text = comparison_text(result, 80)
    assert max(cell_len(line) for line in text.splitlines()) <= 80
    whole = "".join(text.split())
    for name in read.scenario:
        assert whole.count(name) >= 2  # folded, not cut
    assert "if a calculation with each of its" in text
    assert "approximations named is right" in text
    assert "20 ms" in text


def columns_of(lines: list[str]) -> list[int]:
    """Where columns start: after a blank that stands in every line, at a sign that some line has there."""
    size = max(map(len, lines))
    padded = [line.ljust(size) for line in lines]
    blank = [all(line[place] == " " for line in padded) for place in range(size)]
    return [place for place in range(2, size) if blank[place - 1] and blank[place - 2] and not blank[place]]


@pytest.mark.parametrize("width", [80, 100, 140])
def test_every_row_starts_its_columns_at_the_same_places(width: int) -> None:
    names = [one.name for one in RESULT.scenarios]
    seen: list[str] = []
    for block in assessment_text(RESULT, width).split("\n\n"):
        lines = block.splitlines()
        if not any(line and set(line) <= {"─"} for line in lines):
            continue
        header = lines[0]
        starts = columns_of([line for line in lines if set(line) != {"─"}])
        here = [name for name in names if name in header]
        assert starts == [header.index(name) for name in here]
        seen += here
        for line in lines[2:]:
            assert all(line[start : start + 1].strip() for start in starts), line  # no cell is empty
    assert seen == names


def test_differences_line_up_where_no_table_fits() -> None:
    names = ("one", "a_longer_name")
    found = (Difference("line.fwhm", ("5 kHz", "word " * 30)),)
    result = compare(PROBLEM, tuple(one.name for one in RESULT.scenarios[:2]), FAST)
    named = tuple(replace(one, name=name) for one, name in zip(result.assessment.scenarios, names, strict=True))
    text = comparison_text(replace(result, assessment=replace(result.assessment, scenarios=named), differences=found))
    block = text.split("What differs:\n\n")[1].split("\n\n")[0].splitlines()
    assert block[0] == "line.fwhm"
    assert block[1] == "  one            5 kHz"
    assert block[2].startswith("  a_longer_name  word word")
    assert block[3].startswith(" " * 17 + "word")


def test_ascii_says_the_same_in_as_many_lines() -> None:
    text = assessment_text(RESULT)
    plain = encodable(text, "ascii")
    assert plain.isascii()
    assert plain.count("?") == text.count("?")
    assert len(plain.splitlines()) == len(text.splitlines())
