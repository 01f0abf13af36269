"""Starter studies: they load as they stand, show every key, and so do the lines that are commented out."""

from __future__ import annotations

import re
import tomllib

import pytest

from pvfeas import StudyError, UsageError, load_study, problem_of
from pvfeas.keys import keys_of
from pvfeas.line import COMPOSED, VOIGT
from pvfeas.starters import starter
from pvfeas.tables import Goal, Line, Samples, Schedule, Switching, Systematic
from pvfeas.techniques import TECHNIQUES

KINDS = sorted(TECHNIQUES)
OPTIONAL = re.compile(r"# ([a-z_]+) = (.+)")


@pytest.mark.parametrize("kind", KINDS)
def test_loads_without_faults_or_doubts(kind: str) -> None:
    problem = problem_of(load_study(starter(kind)))
    assert problem.warnings == ()
    assert problem.scenarios[0].technique_a.part is TECHNIQUES[kind]
    assert problem.scenarios[0].floor_declared
    assert problem.scenarios[0].schedule_declared


@pytest.mark.parametrize("kind", KINDS)
def test_shows_every_key_with_its_meaning(kind: str) -> None:
    text = starter(kind)
    flat = " ".join(text.replace("\n#  ", "").split())
    for part in (TECHNIQUES[kind], Goal, Line, Samples, Schedule, Switching, Systematic):
        for name, key in keys_of(part).items():
            assert re.search(rf"^(# )?{name} = ", text, re.MULTILINE), name
            assert " ".join(key.meaning.split()) in flat, key.meaning
            for word in key.choices:
                assert word in flat


def switched_on(text: str, number: int) -> str:
    """The starter with one commented-out key taken into use, in place of the same key if it stands already."""
    lines = text.splitlines()
    lines[number] = lines[number].removeprefix("# ")
    return "\n".join(lines) + "\n"


# Taking these keys into use asks for another change too, which the message must say.
ELSEWHERE = {
    "limit": "exclude", "relative_uncertainty": "measure", "hwhm": "fwhm",
    "rate": "molecules|white", "counts": "shot", "background": "shot", "every": "per reset", "after": "as 1/t",
    "rejection": "simultaneous", "molecules": "projection", "contrast": "projection", "h": "allan", "table": "white",
}  # fmt: skip


def load_or_hint(text: str) -> str:
    """Empty where the study loads, else the first word of the message that says what else is needed."""
    try:
        problem_of(load_study(text))
    except StudyError as error:
        return next((word for word in ("both", "without", "coefficient", "width") if word in str(error)), str(error))
    return ""


PATTERN = ("pattern", "dwell", "dead_time")  # go together


@pytest.mark.parametrize("kind", KINDS)
def test_every_optional_line_works_or_says_what_else_it_needs(kind: str) -> None:
    text = starter(kind)
    places = [i for i, line in enumerate(text.splitlines()) if OPTIONAL.fullmatch(line) and "key =" not in line]
    tested = 0
    for place in places:
        name = OPTIONAL.fullmatch(text.splitlines()[place])[1]  # type: ignore[index]  # found above
        if name in ("based_on", "without", "technique"):
            continue  # the child, tested as a whole below
        tested += 1
        if name in (*COMPOSED, *VOIGT):
            if TECHNIQUES[kind].needs_width:
                with pytest.raises(StudyError, match="beside fwhm"):
                    problem_of(load_study(switched_on(text, place)))
            else:
                assert load_or_hint(switched_on(text, place)) in ("", "both", "without", "width", "coefficient")
            continue
        if kind == "quoted" and name in PATTERN:
            with pytest.raises(StudyError, match="dwell" if name == "pattern" else "pattern"):
                problem_of(load_study(switched_on(text, place)))
            continue
        if name not in ELSEWHERE or (name == "hwhm" and not TECHNIQUES[kind].needs_width):
            assert problem_of(load_study(switched_on(text, place))).scenarios
            continue
        with pytest.raises(StudyError, match=ELSEWHERE[name]) as caught:
            problem_of(load_study(switched_on(text, place)))
        assert len(caught.value.faults) == 1, str(caught.value)
    assert tested >= 10


@pytest.mark.parametrize("kind", KINDS)
def test_the_child_at_the_end_works(kind: str) -> None:
    head, child = starter(kind).split("# A second way to measure")
    lines = [line.removeprefix("# ") for line in child.splitlines()[1:]]
    problem = problem_of(load_study(head + "\n".join(lines) + "\n"))
    assert [scenario.name for scenario in problem.scenarios] == ["first", "better"]
    assert len(problem.scenarios[1].systematics) == 1
    assert problem.scenarios[1].technique_a != problem.scenarios[0].technique_a


@pytest.mark.parametrize("kind", KINDS)
def test_lines_are_short_and_plain_toml(kind: str) -> None:
    text = starter(kind)
    assert max(len(line) for line in text.splitlines()) <= 120
    content = tomllib.loads(text)
    assert content["scenario"]["first"]["technique"]["kind"] == kind
    assert text.endswith("\n")


def test_unknown_technique() -> None:
    with pytest.raises(UsageError, match="did you mean ramsey"):
        starter("ramsy")
