"""Wrong studies, one fault each: the message names the line, the address and what would be right.

Each file of tests/studies/invalid says in its first line what is expected:
# expect: line 7 | address beam.technique.snr | words: unit, dB
Line 0: the fault stands nowhere in the file (something is missing as a whole).
"""

from __future__ import annotations

import re
from pathlib import Path

import pytest

from pvfeas import StudyError, load_study, problem_of

FOLDER = Path(__file__).resolve().parent / "studies" / "invalid"
FILES = sorted(FOLDER.glob("*.toml"))
HEAD = re.compile(r"# expect: line (\d+) \| address (.*?)\s*\| words: (.*)")
LIBRARY_TALK = re.compile(
    r"pydantic|pint|tomllib|traceback|validation error|type=|\bNone\b|<class|Error\b", re.IGNORECASE
)


def refused(source: Path | str) -> StudyError:
    """What is wrong with a study, whichever step finds it."""
    with pytest.raises(StudyError) as caught:
        problem_of(load_study(source))
    return caught.value


def test_there_are_enough() -> None:
    assert len(FILES) >= 80


@pytest.mark.parametrize("path", FILES, ids=lambda path: path.stem)
def test_one_clear_message(path: Path) -> None:
    head = HEAD.fullmatch(path.read_text(encoding="utf-8").splitlines()[0])
    assert head is not None, "the first line says what is expected"
    line, address, words = int(head[1]), head[2], head[3].split(", ")
    faults = refused(path).faults
    assert len(faults) == 1, "\n".join(str(fault) for fault in faults)
    fault = faults[0]
    assert fault.line == line, str(fault)
    assert fault.address == address, str(fault)
    assert fault.file == str(path)
    message = f"{fault.found}; {fault.wanted}"
    for word in words:
        assert word in message, str(fault)
    assert fault.found
    assert fault.wanted, "every message says what would be right"
    assert not LIBRARY_TALK.search(message), str(fault)
    assert len(message) < 400


GOOD = """title = "Compound M"
[goal]
kind = "exclude"
power = 0.9
within = "20 d"
[scenario.cell]
splitting = { value = "30 mHz ×/ 2", of = "difference" }
technique = { kind = "quoted", uncertainty = "0.5 Hz ×/ 1.3", after = "1 h" }
"""


def test_the_good_one_is_good() -> None:
    assert problem_of(load_study(GOOD)).scenarios[0].name == "cell"


@pytest.mark.parametrize(
    ("content", "word"),
    [
        (GOOD.encode().replace(b"Compound M", b"Compound \xff M"), "UTF-8"),
        (GOOD.encode("utf-16"), "UTF-8"),
        (GOOD.encode().replace(b"Compound M", b"Compound \x00 M"), "character"),
        (GOOD.encode() + b"# " + b"x" * 1_100_000, "1 MB"),
        (GOOD.encode() + b"[shared]\nx = " + b"[" * 5000 + b"]" * 5000, "nest"),
        (GOOD.encode() + b"[shared]\nx = " + b"{a=" * 5000 + b"1" + b"}" * 5000, "nest"),
        (GOOD.encode() + b"[shared]\nx" + b".a" * 5000 + b' = "1"', "nest"),
        (GOOD.encode() + b"".join(b'[scenario.s%d]\nbased_on = "cell"\n' % i for i in range(150)), "100"),
        (GOOD.encode() + b"[shared]\n" + b"".join(b'x%d = "1(2)"\n' % i for i in range(600)), "500"),
    ],
    ids=[
        "stray byte",
        "utf-16",
        "null",
        "large",
        "deep lists",
        "deep tables",
        "long dots",
        "many scenarios",
        "many inputs",
    ],
)
def test_files_that_are_no_studies(content: bytes, word: str, tmp_path: Path) -> None:
    path = tmp_path / "study.toml"
    path.write_bytes(content)
    faults = refused(path).faults
    assert len(faults) == 1
    assert word in str(faults[0])


def chain(length: int) -> str:
    lines = [f'x{i} = "@x{i + 1}"' for i in range(length)]
    return GOOD + "[shared]\n" + "\n".join([*lines, f'x{length} = "1(1)"']) + "\n"


def test_a_chain_of_references_leads_to_its_end() -> None:
    assert problem_of(load_study(chain(20))).scenarios


def test_a_chain_of_references_too_long_to_follow_is_no_traceback() -> None:
    for fault in refused(chain(450)).faults:
        assert "chain" in fault.found


def test_a_long_chain_of_parents(tmp_path: Path) -> None:
    children = [f'[scenario.s{i}]\nbased_on = "{f"s{i + 1}" if i < 90 else "cell"}"\n' for i in range(91)]
    path = tmp_path / "study.toml"
    path.write_text(GOOD + "".join(children), encoding="utf-8")
    assert len(problem_of(load_study(path)).scenarios) == 92


def test_a_byte_order_mark_is_no_fault(tmp_path: Path) -> None:
    path = tmp_path / "study.toml"
    path.write_bytes(b"\xef\xbb\xbf" + GOOD.replace("\n", "\r\n").encode())
    assert problem_of(load_study(path)).title == "Compound M"


def test_all_faults_at_once_in_the_order_of_their_lines(tmp_path: Path) -> None:
    path = tmp_path / "study.toml"
    text = GOOD.replace("0.9", "1.9").replace('"20 d"', '"20 Hz"').replace("uncertainty", "uncertanty")
    path.write_text(text, encoding="utf-8")
    faults = refused(path).faults
    assert [(fault.line, fault.address) for fault in faults] == [
        (4, "goal.power"), (5, "goal.within"), (8, "cell.technique.uncertanty"),
    ]  # fmt: skip
    assert str(faults[0]).startswith(f"{path}:4: goal.power: ")
