"""The walk of a TOML text sees the keys that tomllib sees, on the lines where they were put."""

from __future__ import annotations

import tomllib
from collections.abc import Iterator
from typing import Any

from hypothesis import given, settings
from hypothesis import strategies as st

from pvfeas.positions import Path, positions

NAMES = st.text(alphabet="abcXYZ019_-", min_size=1, max_size=5)
QUOTED = st.text(alphabet=st.sampled_from("ab .#[]{}=,'é\u03c3"), max_size=5).map(lambda text: f'"{text}"')
KEYS = st.one_of(NAMES, QUOTED)
SCALARS = st.sampled_from(
    [
        "1",
        "-2.5e3",
        "true",
        "1979-05-27",
        '"x # y"',
        "'a = [b]'",
        '"é ± \\n \\u00b5 \\" ="',
        '""',
        "[]",
        "{}",
        "[1, 2,]",
    ]
    + [
        '"""one\n# two\n"three" = 4\n"""',
        "'''\n[not.a.table]\n'''",
        '[ # comment ]\n  "a",\n  [1,\n 2],\n]',
        "07:32:00",
    ]
)


def values(depth: int = 2) -> st.SearchStrategy[str]:
    if depth == 0:
        return SCALARS
    inner = st.lists(st.tuples(KEYS, values(depth - 1)), max_size=3, unique_by=lambda pair: pair[0].strip('"'))
    tables = inner.map(
        lambda pairs: "{ " + ", ".join(f"{key} = {value}" for key, value in pairs if "\n" not in value) + " }"
    )
    lists = st.lists(values(depth - 1), max_size=3).map(lambda items: "[ " + ", ".join(items) + " ]")
    return st.one_of(SCALARS, tables, lists)


NOISE = st.sampled_from(["", "\n", "# [comment] = 'x'\n", "   \t\n\n"])
PAIRS = st.lists(st.tuples(NOISE, KEYS, values()), max_size=4, unique_by=lambda one: one[1].strip('"'))
TABLES = st.lists(st.tuples(NAMES, st.booleans(), PAIRS), max_size=4, unique_by=lambda one: one[0])


def paths(content: Any, prefix: Path = ()) -> Iterator[Path]:
    """Every key of a document as tomllib reads it; entries of lists count as "0", "1", …."""
    pairs = content.items() if isinstance(content, dict) else enumerate(content) if isinstance(content, list) else ()
    for key, value in pairs:
        yield (*prefix, str(key))
        yield from paths(value, (*prefix, str(key)))


def document(first: Any, tables: Any) -> tuple[str, dict[Path, int]]:
    """The text, and the lines where its top keys and those of its tables were put."""
    text, placed = "", {}

    def line() -> int:
        return text.count("\n") + 1

    def add(pairs: Any, prefix: Path) -> None:
        nonlocal text
        for noise, key, value in pairs:
            text += noise
            placed[(*prefix, key[1:-1] if key.startswith('"') else key)] = line()
            text += f"{key} = {value}\n"

    add(first, ())
    for name, array, pairs in tables:
        if (name,) in placed:
            continue
        placed[(name,)] = line()
        text += f"[[{name}]]\n" if array else f"[{name}] # x\n"
        add(pairs, (name, "0") if array else (name,))
    return text, placed


@given(first=PAIRS, tables=TABLES)
@settings(max_examples=400, deadline=None)
def test_generated_documents(first: Any, tables: Any) -> None:
    text, placed = document(first, tables)
    found = positions(text)
    assert set(paths(tomllib.loads(text))) <= set(found)
    for path, line in placed.items():
        assert found[path] == line


@given(first=PAIRS, tables=TABLES)
@settings(max_examples=50, deadline=None)
def test_line_ends_of_other_systems_count_the_same(first: Any, tables: Any) -> None:
    text, _ = document(first, tables)
    assert positions(text.replace("\n", "\r\n")) == positions(text)


def test_dotted_keys_and_nested_arrays_of_tables() -> None:
    text = 'a.b."c d" = 1\n[x.y]\nz.w = 2\n[[x.list]]\nk = 1\n[[x.list]]\nk = 2\n[x.list.inner]\nv = 3\n'
    found = positions(text)
    assert set(paths(tomllib.loads(text))) <= set(found)
    assert found["a", "b", "c d"] == 1
    assert found["x", "y", "z", "w"] == 3
    assert found["x", "list", "0", "k"] == 5
    assert found["x", "list", "1", "k"] == 7
    assert found["x", "list", "1", "inner", "v"] == 9
