"""Lines of keys: generated TOML documents whose lines are known because the test wrote them.

tomllib judges which keys there are; the lines are counted while the document is written.
"""

from __future__ import annotations

import tomllib
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from pvfeas.positions import positions

PathOf = tuple[str, ...]
ROOT = Path(__file__).resolve().parent.parent


def seen(content: Any, path: PathOf = ()) -> Iterator[PathOf]:
    """Every path that tomllib sees; entries of lists by their number."""
    if isinstance(content, dict | list):
        pairs = content.items() if isinstance(content, dict) else enumerate(content)
        for key, value in pairs:
            yield (*path, str(key))
            yield from seen(value, (*path, str(key)))


# trees: a dictionary is a table, a list of dictionaries may be an array of tables, anything else is a value

SNAGS = "ab1-_ .\"'#=[]{},\\\n\tµ×😀"
WORDS = st.text(alphabet="abcxyz019_-", min_size=1, max_size=4)
NAMES = WORDS | st.text(alphabet=SNAGS, max_size=4)
SCALARS = st.sampled_from(
    ["1", "-2.5e3", "true", "1979-05-27T07:32:00Z", "1979-05-27 07:32:00", "07:32:00", "inf", "0xff"]
)
TEXTS = st.text(alphabet=SNAGS, max_size=12) | st.sampled_from(
    ["a = 1\n[b]\nc = 2", '""', "''", '"""', "'''", "#", "\n\n"]
)
VALUES = st.tuples(st.just("scalar"), SCALARS) | st.tuples(st.just("text"), TEXTS)


def trees(depth: int) -> st.SearchStrategy[Any]:
    if depth == 0:
        return VALUES
    inner = trees(depth - 1)
    return VALUES | st.lists(inner, max_size=3) | tables(depth) | st.lists(tables(depth), min_size=1, max_size=3)


def tables(depth: int) -> st.SearchStrategy[dict[str, Any]]:
    return st.dictionaries(NAMES, trees(depth - 1), max_size=3)


class Writer:
    """Writes a tree as TOML, in ways that are drawn, and notes the line on which each key stands first."""

    def __init__(self, data: st.DataObject) -> None:
        self.data = data
        self.text = ""
        self.lines: dict[PathOf, int] = {}

    def pick(self, *choices: Any) -> Any:
        return self.data.draw(st.sampled_from(choices))

    def note(self, path: PathOf) -> None:
        for size in range(1, len(path) + 1):
            self.lines.setdefault(path[:size], self.text.count("\n") + 1)

    def blank(self) -> str:
        return str(self.pick("", "", " ", "\t "))

    def filler(self) -> str:
        return str(self.pick("", "", "\n", "# a = 1\n", "  # [x] 'it\"\n\n"))

    def end(self) -> None:
        self.text += str(self.pick("\n", " # x = 'y\n", "\n\n", "\t\n# [[z]]\n"))

    def key(self, name: str) -> str:
        bare = name != "" and all(char in "abcxyz019_-" for char in name)
        forms = ["bare"] * 3 * bare + ["basic"] + ["literal"] * ("'" not in name and "\n" not in name)
        form = self.pick(*forms)
        if form == "bare":
            return name
        return self.basic(name) if form == "basic" else f"'{name}'"

    def basic(self, text: str) -> str:
        """Escapes where TOML wants them, by name or by number."""
        short = {"\n": "\\n", "\t": "\\t", '"': '\\"', "\\": "\\\\"}
        made = ""
        for char in text:
            coded = f"\\u{ord(char):04x}" if ord(char) < 0x10000 else f"\\U{ord(char):08X}"
            made += self.pick(coded, short.get(char, char)) if char in short else self.pick(char, char, coded)
        return f'"{made}"'

    def string(self, text: str) -> str:
        forms = ["basic", "long"]
        forms += ["literal"] if not set(text) & {"'", "\n"} else []
        forms += ["long literal"] if "'''" not in text and not text.startswith("\n") else []
        form = self.pick(*forms)
        if form == "basic":
            return self.basic(text)
        if form == "literal":
            return f"'{text}'"
        if form == "long literal":
            return f"'''{self.pick('', chr(10))}{text}'''"
        made = text.replace("\\", "\\\\").replace('"""', '""\\"')
        return f'"""{self.pick("", chr(10), chr(92) + chr(10) + "  ")}{made}"""'

    def value(self, node: Any, path: PathOf) -> None:
        """A value after an equals sign or in a list."""
        if isinstance(node, tuple):
            self.text += node[1] if node[0] == "scalar" else self.string(node[1])
        elif isinstance(node, list):
            self.text += "["
            for place, inner in enumerate(node):
                self.text += self.filler() + self.blank()
                self.note((*path, str(place)))
                self.value(inner, (*path, str(place)))
                self.text += self.filler()
                if place < len(node) - 1 or self.pick(True, False):
                    self.text += self.blank() + ","
            self.text += self.filler() + "]"
        else:
            self.text += "{" + self.blank()
            for place, (name, inner) in enumerate(node.items()):
                self.text += ("," + self.blank()) * (place > 0)
                self.pair(path, [], name, inner)
            self.text += self.blank() + "}"

    def pair(self, path: PathOf, dotted: list[str], name: str, node: Any, row: bool = False) -> None:
        """key = value, or one dotted line for each value of a table; row: on a line of its own."""
        way = [*dotted, name]
        if isinstance(node, dict) and node and self.pick(True, False):
            for place, (inner, value) in enumerate(node.items()):
                if not row:
                    self.text += ", " * (place > 0)
                self.pair(path, way, inner, value, row=row)
            return
        self.text += self.blank() * row
        self.note((*path, *way))
        dot = self.pick(".", ".", " . ", ".\t")
        self.text += dot.join(self.key(one) for one in way) + self.blank() + "=" + self.blank()
        self.value(node, (*path, *way))
        if row:
            self.end()

    def table(self, path: PathOf, names: list[str], node: dict[str, Any], header: bool) -> None:
        """A table under its header (or the document): first its values, then its tables, or the other way round."""
        later = [name for name, one in node.items() if self.may_follow(one) and self.pick(True, True, False)]
        only_tables = header and bool(later) and len(later) == len(node)
        late = header and bool(later) and self.pick(True, False)
        if late:
            self.followers(path, names, node, later)
        if header and not (only_tables and not late and self.pick(True, False)):
            self.header(path, names, "[", "]")
        for name, one in node.items():
            if name not in later:
                self.pair(path, [], name, one, row=True)
        if not late:
            self.followers(path, names, node, later)

    def may_follow(self, node: Any) -> bool:
        return isinstance(node, dict) or (
            isinstance(node, list) and bool(node) and all(isinstance(one, dict) for one in node)
        )

    def header(self, path: PathOf, names: list[str], before: str, after: str) -> None:
        self.text += self.filler() + self.blank()
        self.note(path)
        dot = self.pick(".", ".", " . ")
        self.text += before + self.blank() + dot.join(self.key(one) for one in names) + self.blank() + after
        self.end()

    def followers(self, path: PathOf, names: list[str], node: dict[str, Any], later: list[str]) -> None:
        for name in later:
            one = node[name]
            if isinstance(one, dict):
                self.table((*path, name), [*names, name], one, header=True)
                continue
            for place, inner in enumerate(one):
                self.header((*path, name, str(place)), [*names, name], "[[", "]]")
                self.table((*path, name, str(place)), [*names, name], inner, header=False)


@settings(max_examples=200, deadline=None)
@given(tables(4), st.data(), st.sampled_from(["\n", "\r\n"]))
def test_generated_documents(tree: dict[str, Any], data: st.DataObject, newline: str) -> None:
    writer = Writer(data)
    writer.table((), [], tree, header=False)
    text = writer.text.replace("\n", newline)
    content = tomllib.loads(text)  # the writer writes nothing but TOML
    found = positions(text)
    assert set(found) == set(seen(content))
    assert found == writer.lines


DOCUMENT = (
    '''\
title = "x"                       # 1
[a.b]                             # 2
c = 1                             # 3
"d.e" . 'f' = """                 # 4
[no.table]                        # 5
g = 2 \\""" """" # 6, ends with a quote of its own
h.i = 3                           # 7
[[k]]                             # 8
l = [ 1, [2,                      # 9
  3, "]" ], { m = [ "}" ], n.o = 4 } ]   # 10
[k.p]                             # 11
q = 1979-05-27 07:32:00           # 12
[[k]]                             # 13
[[k.r]]                           # 14
[[k.r]]                           # 15
s = '''
    + "'''"
    + """\\ # 16
''''' # 17, ends with two quotes of its own
[a]                               # 18
t = {}                            # 19
"\\u00b5 \\U0001F600" = ""        # 20
"""
)


def test_a_document_by_hand() -> None:
    expected = {
        "title": 1, "a": 2, "a/b": 2, "a/b/c": 3, "a/b/d.e": 4, "a/b/d.e/f": 4, "a/b/h": 7, "a/b/h/i": 7,
        "k": 8, "k/0": 8, "k/0/l": 9, "k/0/l/0": 9, "k/0/l/1": 9, "k/0/l/1/0": 9, "k/0/l/1/1": 10, "k/0/l/1/2": 10,
        "k/0/l/2": 10, "k/0/l/2/m": 10, "k/0/l/2/m/0": 10, "k/0/l/2/n": 10, "k/0/l/2/n/o": 10, "k/0/p": 11, "k/0/p/q": 12,
        "k/1": 13, "k/1/r": 14, "k/1/r/0": 14, "k/1/r/1": 15, "k/1/r/1/s": 16, "a/t": 19, "a/µ 😀": 20,
    }  # fmt: skip
    found = positions(DOCUMENT)
    assert {"/".join(path): line for path, line in found.items()} == expected
    assert set(found) == set(seen(tomllib.loads(DOCUMENT)))


@pytest.mark.parametrize("text", ["", "\n", "# a = 1", "  \t\n#\n", "\r\n"])
def test_nothing_in_nothing(text: str) -> None:
    assert positions(text) == {}


def test_no_end_of_line_at_the_end() -> None:
    assert positions("[a]\nb = 1") == {("a",): 1, ("a", "b"): 2}
    assert positions("a = [1,\n2]") == {("a",): 1, ("a", "0"): 1, ("a", "1"): 2}


def readable() -> Iterator[Path]:
    """The study files of the project that are TOML."""
    for path in sorted(ROOT.glob("data/studies/*.toml")) + sorted(ROOT.glob("tests/studies/**/*.toml")):
        if not path.name.startswith(("toml_", "unquoted_")):
            yield path


@pytest.mark.parametrize("path", list(readable()), ids=lambda path: path.stem)
def test_studies(path: Path) -> None:
    """Keys as tomllib sees them, each on a line on which its name stands."""
    text = path.read_text(encoding="utf-8")
    found, lines = positions(text), text.split("\n")
    assert set(found) == set(seen(tomllib.loads(text)))
    for keys, line in found.items():
        if not keys[-1].isdigit():
            assert keys[-1] in lines[line - 1]
