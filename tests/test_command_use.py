"""Options and arguments of the command line, right and wrong, in this process."""

from __future__ import annotations

import json
import os
import subprocess
import sys
import sysconfig
import unicodedata
from collections.abc import Callable
from pathlib import Path

import click
import pytest
from click.testing import CliRunner

from pvfeas.cli import COMMANDS, cli, run
from pvfeas.studyfile import load_study

ROOT = Path(__file__).resolve().parent.parent
FAST = ("--tolerance", "30")
STUDY = """
title = "A cell (invented)"
[goal]
kind = "detect"
significance = 5
power = 0.9
within = "20 d"
[shared]
rate = "1.0(1) kHz"
[scenario.cell]
splitting = { value = "30 mHz ×/ 2", of = "difference" }
technique = { kind = "ramsey", free_time = "0.1 s", contrast = 0.8, molecules = "20 ×/ 1.5" }
systematics.stray = { size = "2 mHz ×/ 1.5", averages = "never" }
[scenario.trap]
based_on = "cell"
technique = { free_time = "0.2 s" }
"""
Said = Callable[..., tuple[int, str, str]]


@pytest.fixture
def here(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    monkeypatch.chdir(tmp_path)
    (tmp_path / "study.toml").write_text(STUDY, encoding="utf-8")
    return tmp_path


@pytest.fixture
def said(here: Path, capsys: pytest.CaptureFixture[str]) -> Said:
    """Run in this process: code, stdout, stderr."""

    def call(*arguments: str) -> tuple[int, str, str]:
        code = run(list(arguments))
        return code, *capsys.readouterr()

    return call


@pytest.mark.parametrize("arguments", [[], *([name] for name in COMMANDS)], ids=["pvfeas", *COMMANDS])
def test_help(arguments: list[str]) -> None:
    """Every command explains itself in ASCII within 80 columns, by -h as by --help."""
    for flag in ("-h", "--help"):
        done = CliRunner().invoke(cli, [*arguments, flag], prog_name="pvfeas")
        assert done.exit_code == 0
        assert done.output.startswith(f"Usage: pvfeas {' '.join(arguments)}".rstrip())
        assert done.output.isascii()
        assert max(map(len, done.output.splitlines())) <= 80


def test_the_script_is_the_module(here: Path) -> None:
    script = Path(sysconfig.get_path("scripts")) / ("pvfeas.exe" if os.name == "nt" else "pvfeas")
    if not script.exists():
        pytest.skip("pvfeas is not installed here")
    for arguments in (["--version"], ["check", "study.toml"], ["check", "nowhere.toml"], ["assess", "--help"]):
        answers = [
            subprocess.run([*start, *arguments], capture_output=True, cwd=here, timeout=60)
            for start in ([str(script)], [sys.executable, "-m", "pvfeas"])
        ]
        assert len({(one.returncode, one.stdout, one.stderr) for one in answers}) == 1


def fields(code: int, out: str, err: str) -> str:
    assert (code, err) == (0, "")
    return out


def right(setting: str, address: str, said: Said) -> str:
    """What check shows of an input after a setting."""
    out = fields(*said("check", "study.toml", "--set", setting))
    return next(line for line in out.splitlines() if line.startswith(f"{address} = ")).split(" = ", 1)[1]


@pytest.mark.parametrize(
    ("setting", "address", "shown"),
    [
        ("cell.technique.free_time=50 ms", "cell.technique.free_time", "50 ms"),
        ("cell.technique.free_time =  50 ms ", "cell.technique.free_time", "50 ms"),
        ("cell.technique.contrast=0.5", "cell.technique.contrast", "0.5"),
        ("cell.technique.contrast=5e-1", "cell.technique.contrast", "5e-1"),
        ("cell.splitting=-1.0(2) Hz", "cell.splitting", "-1.0(2) Hz"),
        ("trap.technique.free_time=@cell.technique.free_time", "cell.technique.free_time", "0.1 s"),
        ("shared.rate=2 kHz", "shared.rate", "2 kHz"),
        ('cell.technique.free_time={value = "50 ms", source = "here"}', "cell.technique.free_time", "50 ms"),
    ],
)
def test_settings_that_are_right(said: Said, setting: str, address: str, shown: str) -> None:
    if address == "shared.rate":
        setting_used = ["--set", "cell.technique.molecules=20"]
        assert said("check", "study.toml", "--set", setting, *setting_used)[0] == 0
        return
    assert right(setting, address, said) == shown


def test_the_last_of_several_settings_counts(said: Said) -> None:
    settings = ["--set", "cell.technique.free_time=50 ms", "--set", "cell.technique.free_time=70 ms"]
    out = fields(*said("check", "study.toml", *settings))
    assert "cell.technique.free_time = 70 ms" in out
    assert "50 ms" not in out


def test_a_setting_is_what_the_file_would_say(said: Said, here: Path) -> None:
    """The same numbers; the study's hash differs, for the resolved study says that a value is the command line's."""
    (here / "other.toml").write_text(
        STUDY.replace('"0.2 s"', '"0.3 s"').replace('"20 d"', '["2 d", "9 d"]'), encoding="utf-8"
    )
    by_hand = json.loads(fields(*said("assess", "other.toml", "--json", *FAST)))
    settings = ["--set", "trap.technique.free_time=0.3 s", "--set", 'goal.within=["2 d", "9 d"]']
    by_setting = json.loads(fields(*said("assess", "study.toml", "--json", *FAST, *settings)))
    assert by_setting["scenarios"] == by_hand["scenarios"]
    assert by_setting["study"]["sha256"] != by_hand["study"]["sha256"]


@pytest.mark.parametrize(
    ("setting", "words"),
    [
        ("", "there is no ="),
        ("cell.technique.free_time", "write --set ADDRESS=VALUE"),
        ("=5", "is no address of this study"),
        ("=", "is no address of this study"),
        ("cell.technique.free_time=", "an empty text"),
        ("cell.technique.free_time=5 s s", "cell.technique.free_time"),
        ("cell.technique.free_time=5 Hz", "a time is needed here"),
        ("cell.technique.free_tiem=5 s", "did you mean free_time?"),
        ("cell.technik.free_time=5 s", "did you mean technique?"),
        ("scenario.cell.technique.free_time=5 s", "an address begins with one of goal, shared, title, cell, trap"),
        ("cel.technique.free_time=5 s", "did you mean cell?"),
        ("cell.technique.free_time={", "is not TOML"),
        ("cell.technique.free_time=[1, 2]", "cell.technique.free_time"),
        ("cell.technique.free_time=1e400 s", "cell.technique.free_time"),
        ("cell.technique.free_time=nan", "cell.technique.free_time"),
        ("goal.power=1.5", "goal.power"),
        ("goal.kind=detekt", "did you mean detect?"),
        ("cell.technique.free_time=@nowhere", "nowhere"),
        ("cell.technique=5", "where a table belongs"),
        (f"cell.technique.free_time={'x' * 5000}", "at most 1000"),
    ],
)
def test_settings_that_are_wrong(said: Said, setting: str, words: str) -> None:
    code, out, err = said("check", "study.toml", "--set", setting)
    assert (code, out) == (2, "")
    assert words in err
    assert "--set" in err or "study.toml:" in err


@pytest.mark.parametrize(
    "setting",
    [
        "title=A new title",
        "cell.technique.free_time.value=50 ms",
        'cell.systematics.drift={ size = "1 mHz", averages = "never" }',
    ],
)
def test_settings_that_should_be_right(said: Said, setting: str) -> None:
    assert said("check", "study.toml", "--set", setting)[0] == 0


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        ([""], "no command ''"),
        (["chek", "study.toml"], "did you mean check?"),
        (["--colour"], "--colour"),
        (["check"], "Missing argument 'STUDY'"),
        (["check", ""], "STUDY is empty"),
        (["check", "study.toml", "more"], "more"),
        (["check", "nowhere.toml"], "nowhere.toml does not exist"),
        (["check", "."], ". cannot be read: is a directory"),
        (["check", "study.toml", "-o"], "requires an argument"),
        (["check", "study.toml", "-o", ""], "--output: no file is named"),
        (["check", "study.toml", "-o", "study.toml"], "study.toml is the study already"),
        (["resolve", "study.toml", "-o", "./study.toml"], "./study.toml is the study already"),
        (["assess", "study.toml", "-o", "x.xlsx"], "no format goes with .xlsx"),
        (["assess", "study.toml", "--scenario", "cel"], "did you mean cell?"),
        (["assess", "study.toml", "--scenario", ""], "no scenario"),
        (["assess", "study.toml", "--tolerance", "nan"], "no number"),
        (["assess", "study.toml", "--tolerance", "inf"], "not in the range"),
        (["assess", "study.toml", "--fail-under", "nan"], "no number"),
        (["assess", "study.toml", "--fail-under", "90 %"], "--fail-under"),
        (["assess", "study.toml", "--fail-under", "1.1"], "not in the range"),
        (["assess", "study.toml", "--seed", "-1"], "not in the range"),
        (["assess", "study.toml", "--seed", "1.5"], "--seed"),
        (["assess", "study.toml", "--maximum-points", "10"], "not in the range"),
        (["assess", "study.toml", "--method", "latice"], "lattice"),
        (["assess", "study.toml", "--figure", "x.bmp"], "figures are written as .pdf, .svg, .png"),
        (["assess", "study.toml", "--figure", "-"], "figures are written as .pdf, .svg, .png"),
        (["assess", "study.toml", "--figure-data", "-"], "standard output is the target of --output already"),
        (["compare", "study.toml", "cell"], "at least two scenarios"),
        (["compare", "study.toml", "cell", "cell"], "at least two scenarios"),
        (["compare", "study.toml", "cell", "tarp"], "did you mean trap?"),
        (["new"], "Missing argument 'TECHNIQUE'"),
        (["new", "ramsay"], "did you mean ramsey?"),
        (["new", "scan", "-o", "study.toml"], "study.toml is there already"),
        (["new", "scan", "-o", "."], ". is there already"),
        (["new", "scan", "-o", ""], "--output: no file is named"),
        (["new", "scan", "-o", "missing/x.toml"], "missing/x.toml cannot be written: no such file or directory"),
        (["convert", "5"], "5"),
        (["convert", "5 m"], "'m' is no unit"),
        (["convert", "5 Hz", "--to", "hz"], "did you mean Hz?"),
        (["convert", "5 Hz", "--digits", "0"], "not in the range"),
        (["convert", "5 Hz", "--minus", "x"], "x"),
    ],
    ids=lambda given: " ".join(given) if isinstance(given, list) else "",
)
def test_wrong_use(said: Said, here: Path, arguments: list[str], words: str) -> None:
    """Code 2, nothing on stdout, one message on stderr, nothing written."""
    code, out, err = said(*arguments)
    assert (code, out) == (2, "")
    assert words in err
    assert "Traceback" not in err
    assert "bug" not in err
    assert [one.name for one in here.iterdir()] == ["study.toml"]
    assert (here / "study.toml").read_text(encoding="utf-8") == STUDY


@pytest.mark.parametrize(
    ("output", "more", "begins"),
    [
        ("x.json", [], "{"), ("x.JSON", [], "{"), ("x.csv", [], "scenario,"), ("x.txt", [], "A cell"), ("x", [], "A cell"),
        ("x.txt", ["--json"], "{"), ("x.json", ["--csv"], "scenario,"), ("x.odd", ["--csv"], "scenario,"),
        ("-", ["--json"], "{"), ("-", ["--csv"], "scenario,"), ("-", [], "A cell"),
    ],
)  # fmt: skip
def test_the_format_is_asked_for_or_the_suffix_s(
    said: Said, here: Path, output: str, more: list[str], begins: str
) -> None:
    for command in ("assess", "compare"):
        out = fields(*said(command, "study.toml", *FAST, *more, "-o", output))
        text = out if output == "-" else (here / output).read_text(encoding="utf-8")
        assert text.startswith(begins)
        assert (out == "") == (output != "-")


def test_new_never_overwrites_but_writes_through_devices(said: Said, here: Path) -> None:
    assert said("new", "scan", "-o", os.devnull)[0] == 0
    (here / "link.toml").symlink_to("study.toml")
    assert said("new", "scan", "-o", "link.toml")[0] == 2
    assert (here / "study.toml").read_text(encoding="utf-8") == STUDY


def test_a_bug_shows_its_traceback_on_demand(said: Said, monkeypatch: pytest.MonkeyPatch) -> None:
    from pvfeas import understanding

    def broken(*_: object) -> None:
        raise ZeroDivisionError("by \x1b[31mzero")

    monkeypatch.setattr(understanding, "understood", broken)
    code, out, err = said("check", "study.toml")
    assert (code, out) == (1, "")
    assert "ZeroDivisionError: by ?[31mzero" in err
    with pytest.raises(ZeroDivisionError):
        run(["--debug", "check", "study.toml"])


STEERING = """
title = "red \\u001b[31m\\u009b"
[goal]
kind = "de\\u001b[2Jtect"
"k\\u001b[31m\\u009b\\u202e" = 3
within = "\\u001b[31m 5"
[scenario."a\\u001b"]
[scenario.b]
splitting = { value = "1 \\u009bHz", of = "difference" }
"\\u001b" = 2
"""


@pytest.mark.parametrize("command", ["check", "resolve", "assess", "compare"])
def test_no_message_steers_the_terminal(said: Said, here: Path, command: str) -> None:
    (here / "bad.toml").write_text(STEERING, encoding="utf-8")
    for arguments in (
        ["bad.toml"],
        ["no\x1b[31m.toml"],
        ["study.toml", "--set", "c\x1b[2J.x=1"],
        ["study.toml", "-o", "no\x9b/x.txt"],
    ):
        code, out, err = said(command, *arguments)
        assert (code, out) == (2, "")
        assert not [sign for sign in err if sign != "\n" and unicodedata.category(sign) in ("Cc", "Cf", "Zl", "Zp")]


@pytest.mark.parametrize("encoding", ["ascii", "cp1252", "latin-1", "utf-8"])
def test_what_is_read_back_does_not_depend_on_the_terminal(here: Path, encoding: str) -> None:
    """Escapes, not look-alikes: σ of a title is no sigma after a detour through an ASCII pipe."""
    text = STUDY.replace("A cell", "σ of Ω: ½ × \\U0001F600")
    (here / "greek.toml").write_text(text, encoding="utf-8")
    environment = {**os.environ, "PYTHONIOENCODING": encoding, "PYTHONUTF8": "0"}

    def call(*arguments: str) -> bytes:
        start = [sys.executable, "-m", "pvfeas"]
        return subprocess.run(
            [*start, *arguments], capture_output=True, cwd=here, env=environment, check=True, timeout=60
        ).stdout

    answer = json.loads(call("assess", "greek.toml", "--json", *FAST).decode(encoding))
    title = load_study(text).title
    assert answer["study"]["title"] == title
    assert load_study(call("resolve", "greek.toml").decode(encoding)).title == title
    assert call("new", "ramsey").decode(encoding).strip()


@pytest.mark.parametrize("encoding", ["ascii", "cp1252"])
def test_messages_in_few_signs(here: Path, encoding: str) -> None:
    environment = {**os.environ, "PYTHONIOENCODING": encoding, "PYTHONUTF8": "0"}
    start = [sys.executable, "-m", "pvfeas", "check", "study.toml", "--set", "cell.technique.free_time=x"]
    done = subprocess.run(start, capture_output=True, cwd=here, env=environment, timeout=60)
    assert done.returncode == 2
    text = done.stderr.decode(encoding)
    assert ("x/ 1.5" in text) == (encoding == "ascii")
    assert ("×/ 1.5" in text) == (encoding != "ascii")
    assert "\\x" not in text


def test_the_group_lists_what_there_is() -> None:
    context = click.Context(cli)
    assert cli.list_commands(context) == list(COMMANDS)
    assert cli.get_command(context, "nothing") is None
    for name in COMMANDS:
        found = cli.get_command(context, name)
        assert found is not None
        assert found.name == name
