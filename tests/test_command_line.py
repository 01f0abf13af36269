"""The command line as its users meet it: exit codes, streams, terminals, wrong use."""

from __future__ import annotations

import csv
import io
import json
import os
import signal
import subprocess
import sys
from pathlib import Path

import click
import pytest

from pvfeas.cli import COMMANDS, cli

ROOT = Path(__file__).resolve().parent.parent
BEAM = ROOT / "data" / "studies" / "beam-line-scan.toml"
FAST = ("--tolerance", "30")
STUDY = """
[goal]
kind = "detect"
significance = 5
power = 0.9
within = "20 d"
[scenario.cell]
splitting = { value = "30 mHz ×/ 2", of = "difference" }
technique = { kind = "quoted", uncertainty = "0.05 Hz ×/ 1.3", after = "1 h" }
"""


def run(
    *arguments: str, stdin: str | None = None, cwd: Path | None = None, **environment: str
) -> subprocess.CompletedProcess[str]:
    """The command in a process of its own."""
    return subprocess.run(
        [sys.executable, "-m", "pvfeas", *arguments], capture_output=True, text=True, encoding="utf-8", input=stdin,
        env={**os.environ, "PYTHONUTF8": "1", **environment}, cwd=cwd or ROOT, timeout=120,
    )  # fmt: skip


@pytest.fixture
def study(tmp_path: Path) -> str:
    path = tmp_path / "study.toml"
    path.write_text(STUDY, encoding="utf-8")
    return str(path)


@pytest.mark.parametrize("name", COMMANDS)
def test_every_option_says_what_it_does(name: str) -> None:
    command = cli.get_command(click.Context(cli), name)
    assert command is not None
    assert command.help
    for parameter in command.params:
        if isinstance(parameter, click.Option):
            assert parameter.help, f"{name} {parameter.opts}"


def test_help_imports_nothing_heavy() -> None:
    code = "import sys; from pvfeas.cli import run; run(['--help']); print(sorted(sys.modules), file=sys.stderr)"
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True, cwd=ROOT)
    loaded = done.stderr
    assert not any(f"'{name}'" in loaded for name in ("numpy", "scipy", "pydantic", "pint", "matplotlib", "rich"))
    assert all(name in done.stdout for name in COMMANDS)


def test_codes_and_streams(study: str) -> None:
    good = run("assess", study, *FAST)
    assert (good.returncode, good.stderr) == (0, "")
    assert "cell" in good.stdout
    assert run("assess", study, *FAST, "--fail-under", "0.9999999").returncode == 3
    assert run("assess", study, *FAST, "--fail-under", "0").returncode == 0
    wrong = run("assess", study, "--set", "cell.technique.after='1 Hz'")
    assert (wrong.returncode, wrong.stdout) == (2, "")
    assert "cell.technique.after" in wrong.stderr


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        (("assess", "nowhere.toml"), ("nowhere.toml", "does not exist")),
        (("asess", "x.toml"), ("asess", "did you mean assess?")),
        (("assess", str(BEAM), "--scenario", "todday"), ("todday", "today")),
        (("compare", str(BEAM), "today"), ("two scenarios",)),
        (("assess", str(BEAM), "--tolerence", "1"), ("--tolerence", "--tolerance")),
        (("assess", str(BEAM), "--tolerance", "-1"), ("--tolerance",)),
        (("assess", str(BEAM), "-o", "x.docx"), (".docx", ".json")),
        (("assess", str(BEAM), "--figure", "x.gif", "--tolerance", "30"), ("x.gif", ".pdf")),
        (("assess", str(BEAM), "--set", "today.line.fwhm"), ("today.line.fwhm", "ADDRESS=VALUE")),
        (("assess", str(BEAM), "--set", "todya.line.fwhm=5 kHz"), ("todya", "today")),
        (("new", "rabbi"), ("rabbi",)),
        (("convert", "6.2 aeV", "--to", "parsec"), ("parsec",)),
        (("convert", "many"), ("many",)),
        (("assess", str(ROOT)), ("directory",)),
        (("assess",), ("STUDY",)),
    ],
)
def test_wrong_use_is_one_message(tmp_path: Path, arguments: tuple[str, ...], words: tuple[str, ...]) -> None:
    done = run(*arguments, cwd=tmp_path)
    assert done.returncode == 2
    assert done.stdout == ""
    assert "Traceback" not in done.stderr
    for word in words:
        assert word in done.stderr
    assert list(tmp_path.iterdir()) == []


@pytest.mark.parametrize(
    "data",
    [b"", b"\x00\x01\x02\xff\xfe", b"[goal\n", "title = 'é'".encode("latin-1"), b"a = 1\n" * 200_000, b"[" * 5000, b"x = " + b"[" * 5000],
    ids=["empty", "binary", "broken", "latin-1", "a million bytes", "brackets", "nested"],
)  # fmt: skip
def test_files_that_are_no_study(tmp_path: Path, data: bytes) -> None:
    path = tmp_path / "study.toml"
    path.write_bytes(data)
    done = run("check", str(path))
    assert (done.returncode, done.stdout) == (2, "")
    assert "Traceback" not in done.stderr
    assert "bug" not in done.stderr
    assert len(done.stderr) < 20_000


@pytest.mark.skipif(os.geteuid() == 0, reason="the superuser may read anything")
def test_a_file_that_may_not_be_read(study: str) -> None:
    Path(study).chmod(0)
    done = run("check", study)
    assert done.returncode == 2
    assert "permission denied" in done.stderr.lower()


def test_line_ends_and_byte_order_mark(tmp_path: Path) -> None:
    path = tmp_path / "study.toml"
    plain = run("check", "-", stdin=STUDY).stdout
    path.write_bytes(b"\xef\xbb\xbf" + STUDY.replace("\n", "\r\n").encode())
    assert run("check", str(path)).stdout == plain


def test_standard_input_and_output(study: str, tmp_path: Path) -> None:
    piped = run("assess", "-", "--json", *FAST, stdin=STUDY)
    assert json.loads(piped.stdout) == json.loads(run("assess", study, "--json", *FAST).stdout)
    named = tmp_path / "out.json"
    assert run("assess", study, *FAST, "-o", str(named)).stdout == ""
    assert json.loads(named.read_text(encoding="utf-8")) == json.loads(piped.stdout)


def test_suffix_sets_the_format(study: str, tmp_path: Path) -> None:
    run("assess", study, *FAST, "-o", str(tmp_path / "a.csv"), "--figure-data", str(tmp_path / "b.csv"))
    rows = list(csv.DictReader(io.StringIO((tmp_path / "a.csv").read_text(encoding="utf-8"))))
    assert [row["scenario"] for row in rows] == ["cell"]
    assert (tmp_path / "b.csv").read_text(encoding="utf-8").startswith("scenario,curve,wall_time (s)")


def test_settings(study: str) -> None:
    def chance(*settings: str) -> float:
        given = [word for one in settings for word in ("--set", one)]
        return float(
            json.loads(run("assess", study, "--json", *FAST, *given).stdout)["scenarios"][0]["chance"]["value"]
        )

    assert chance("cell.technique.after=1 d") < chance() < chance("goal.within=400 d")
    assert chance('cell.splitting={value = "1 Hz", of = "difference"}') > 0.99


@pytest.mark.parametrize("encoding", ["ascii", "cp1252", "utf-8"])
def test_terminals_that_know_few_signs(study: str, encoding: str) -> None:
    code = [sys.executable, "-m", "pvfeas", "check", study]
    done = subprocess.run(
        code, capture_output=True, env={**os.environ, "PYTHONIOENCODING": encoding, "PYTHONUTF8": "0"}, cwd=ROOT
    )
    assert done.returncode == 0, done.stderr
    text = done.stdout.decode(encoding)
    assert ("×" in text) == (encoding != "ascii")
    table = subprocess.run(
        [*code[:3], "assess", study, *FAST],
        capture_output=True,
        env={**os.environ, "PYTHONIOENCODING": encoding, "PYTHONUTF8": "0"},
        cwd=ROOT,
    )
    assert table.returncode == 0, table.stderr
    assert "?" not in table.stdout.decode(encoding)


def test_a_pipe_gets_no_colour_and_eighty_columns(study: str) -> None:
    text = run("assess", study, *FAST, FORCE_COLOR="1", COLUMNS="40").stdout
    assert "\x1b" not in text
    assert max(map(len, text.splitlines())) <= 80


@pytest.mark.parametrize(
    ("environment", "coloured"), [({}, True), ({"NO_COLOR": "1"}, False), ({"TERM": "dumb"}, False)]
)
def test_colour_on_a_terminal_only(study: str, environment: dict[str, str], coloured: bool) -> None:
    pty = pytest.importorskip("pty")
    reading, writing = pty.openpty()
    process = subprocess.Popen(
        [sys.executable, "-m", "pvfeas", "assess", study, *FAST], stdout=writing, stderr=subprocess.DEVNULL, cwd=ROOT,
        env={**{key: value for key, value in os.environ.items() if key != "NO_COLOR"}, "TERM": "xterm", **environment},
    )  # fmt: skip
    os.close(writing)
    found = b""
    while True:
        try:
            piece = os.read(reading, 65536)
        except OSError:  # the other end is closed
            break
        if not piece:
            break
        found += piece
    os.close(reading)
    assert process.wait(60) == 0
    assert (b"\x1b[1m" in found) == coloured


@pytest.mark.parametrize(
    "arguments",
    [["--help"], ["--version"], ["assess", "--help"], ["new", "scan"], ["convert", "1 Hz"], ["check"], ["resolve"], ["assess", "--json", *FAST]],
    ids=" ".join,
)  # fmt: skip
def test_a_closed_pipe_is_no_error(study: str, arguments: list[str]) -> None:
    given = [*arguments, study] if arguments[0] in ("check", "resolve") or "--json" in arguments else arguments
    process = subprocess.Popen(
        [sys.executable, "-m", "pvfeas", *given], stdout=subprocess.PIPE, stderr=subprocess.PIPE, cwd=ROOT
    )
    assert process.stdout is not None
    process.stdout.close()
    _, said = process.communicate(timeout=60)
    assert (process.returncode, said) == (0, b"")


@pytest.mark.skipif(os.name != "posix", reason="a shell's redirections")
@pytest.mark.parametrize(
    ("line", "code", "words"),
    [
        ("assess {0} --json --tolerance 30 | head -1", 0, ""),
        ("check {0} > /dev/full", 2, "standard output cannot be written: no space left on device"),
        ("--help > /dev/full", 2, "standard output cannot be written: no space left on device"),
        ("check {0} >&-", 2, "standard output cannot be written: it is closed"),
        ("assess {0} --tolerance 30 >&-", 2, "standard output cannot be written: it is closed"),
        ("check - <&-", 2, "standard input cannot be read: it is closed"),
        ("check nowhere.toml 2>&-", 2, ""),
        ("check nowhere.toml 2>/dev/full", 2, ""),
        ("assess {0} --tolerance 30 2>&- >/dev/null", 0, ""),
        ("check /dev/zero", 2, "larger than 1 MB"),
        ("check /dev/null", 2, "there is no scenario"),
        ("assess {0} --tolerance 30 -o /dev/full", 2, "/dev/full cannot be written: no space left on device"),
    ],
)
def test_redirections(study: str, line: str, code: int, words: str) -> None:
    script = f"set -o pipefail; '{sys.executable}' -m pvfeas {line.format(study)}"
    done = subprocess.run(
        ["bash", "-c", script], capture_output=True, text=True, encoding="utf-8", cwd=ROOT, timeout=60
    )
    assert done.returncode == code, done.stderr
    assert words in done.stderr
    assert "Traceback" not in done.stderr
    assert "bug" not in done.stderr
    assert (done.stderr == "") == (words == "")


def on_a_terminal(arguments: list[str], until: bytes, cwd: Path) -> tuple[int, bytes]:
    """Run with stderr on a terminal and send SIGINT once that text is there; the code and what was said."""
    pty = pytest.importorskip("pty")
    reading, writing = pty.openpty()
    process = subprocess.Popen(
        [sys.executable, "-m", "pvfeas", *arguments], stdout=subprocess.DEVNULL, stderr=writing, cwd=cwd,
        env={**os.environ, "PYTHONPATH": str(ROOT)},
    )  # fmt: skip
    os.close(writing)
    said = b""
    while True:
        try:
            piece = os.read(reading, 65536)
        except OSError:  # the other end is closed
            break
        if not piece:
            break
        said += piece
        if until in said:
            process.send_signal(signal.SIGINT)
            until = b"never said"
    os.close(reading)
    return process.wait(60), said


def test_interruption(tmp_path: Path) -> None:
    """In the middle of the work, which says how far it is; files of an earlier run stay as they were."""
    (tmp_path / "out.json").write_bytes(b"old")
    targets = ["-o", "out.json", "--figure", "out.svg", "--figure-data", "out.csv"]
    long = ["assess", str(BEAM), "--tolerance", "0.001", "--maximum-points", "1048576", *targets]
    code, said = on_a_terminal(long, b"points", tmp_path)
    assert code == 130
    assert said.replace(b"\r\n", b"\n").endswith(b" s \r\x1b[K\ninterrupted\n")  # the line of progress is cleared first
    assert [one.name for one in tmp_path.iterdir()] == ["out.json"]
    assert (tmp_path / "out.json").read_bytes() == b"old"


def test_new_writes_once(tmp_path: Path) -> None:
    target = tmp_path / "study.toml"
    assert run("new", "scan", "-o", str(target)).returncode == 0
    first = target.read_bytes()
    again = run("new", "ramsey", "-o", str(target))
    assert again.returncode == 2
    assert target.read_bytes() == first
    assert run("check", str(target)).returncode == 0


def test_resolve_reads_back(study: str) -> None:
    text = run("resolve", study).stdout
    assert run("assess", "-", *FAST, "--json", stdin=text).stdout == run("assess", study, *FAST, "--json").stdout


def test_convert() -> None:
    """E_h in Hz, CODATA 2022: 6.5796839204999e15; differences keep digits that floats lose."""
    assert float(run("convert", "1 E_h", "--to", "Hz", "--digits", "14").stdout.split()[0]) == 6.5796839204999e15
    done = run("convert", "--minus", "29979245799.999999999999 Hz", "--to", "Hz", "--digits", "3", "1 cm^-1")
    assert float(done.stdout.split()[0]) == pytest.approx(1e-12)


def test_a_bug_is_called_a_bug(monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str], study: str) -> None:
    from pvfeas import cli as module
    from pvfeas.questions import assess

    def broken(*_: object) -> None:
        raise RuntimeError("impossible")

    monkeypatch.setattr(assess, "assess", broken)
    assert module.run(["assess", study]) == 1
    assert "bug" in capsys.readouterr().err
