"""Where things stand in a TOML text: the line of every key.

A small walk of the text that knows the shapes of TOML well enough to follow keys; what the
values are is tomllib's business.
"""

from __future__ import annotations

import re
from bisect import bisect_left
from collections.abc import Iterator

Path = tuple[str, ...]
BARE = re.compile(r"[A-Za-z0-9_-]+")
ESCAPES = {"n": "\n", "t": "\t", "r": "\r", "b": "\b", "f": "\f", '"': '"', "\\": "\\", "e": "\x1b"}


def positions(text: str) -> dict[Path, int]:
    """The line (from 1) of each key, by its path; entries of arrays of tables and lists count as "0", "1", …."""
    walk = _Walk(text)
    walk.document()
    return walk.found


class _Walk:
    def __init__(self, text: str) -> None:
        self.text = text.replace("\r\n", "\n")
        self.at = 0
        self.found: dict[Path, int] = {}
        self.arrays: dict[Path, int] = {}
        self.ends = [place for place, char in enumerate(self.text) if char == "\n"]

    def line(self) -> int:
        return bisect_left(self.ends, self.at) + 1

    def peek(self, size: int = 1) -> str:
        return self.text[self.at : self.at + size]

    def blanks(self, newlines: bool = True) -> None:
        """Skip white space and comments."""
        while self.at < len(self.text):
            char = self.peek()
            if char in " \t" or (newlines and char == "\n"):
                self.at += 1
            elif char == "#":
                end = self.text.find("\n", self.at)
                self.at = len(self.text) if end < 0 else end
            else:
                return

    def document(self) -> None:
        prefix: Path = ()
        while True:
            self.blanks()
            if self.at >= len(self.text):
                return
            if self.peek() == "[":
                prefix = self.header()
            else:
                self.pair(prefix)

    def header(self) -> Path:
        line, double = self.line(), self.peek(2) == "[["
        self.at += 2 if double else 1
        path = self.placed(tuple(self.key()), last=not double)
        if double:
            count = self.arrays.get(path, 0)
            self.arrays[path] = count + 1
            self.note(path, line)
            path = (*path, str(count))
        self.note(path, line)
        self.at += 2 if double else 1
        return path

    def placed(self, path: Path, last: bool = True) -> Path:
        """The path with the running number put in behind every array of tables on the way."""
        made: Path = ()
        for place, part in enumerate(path):
            made = (*made, part)
            if made in self.arrays and (last or place < len(path) - 1):
                made = (*made, str(self.arrays[made] - 1))
        return made

    def note(self, path: Path, line: int) -> None:
        for size in range(1, len(path) + 1):
            self.found.setdefault(path[:size], line)

    def pair(self, prefix: Path) -> None:
        line = self.line()
        path = prefix + tuple(self.key())
        for size in range(len(prefix) + 1, len(path) + 1):
            self.found.setdefault(path[:size], line)
        self.at += 1  # the equals sign
        self.value(path)

    def key(self) -> Iterator[str]:
        while True:
            self.blanks(newlines=False)
            yield self.simple()
            self.blanks(newlines=False)
            if self.peek() != ".":
                return
            self.at += 1

    def simple(self) -> str:
        if self.peek() in "\"'" and self.peek():
            return self.string()
        match = BARE.match(self.text, self.at)
        if match is None:  # tomllib has accepted the text, so this is the end of it
            self.at += 1
            return ""
        self.at = match.end()
        return match[0]

    def string(self) -> str:
        quote = self.peek()
        if self.peek(3) == quote * 3:
            return self.long_string(quote)
        self.at += 1
        made = []
        while self.at < len(self.text) and self.peek() != quote:
            if self.peek() == "\\" and quote == '"':
                made.append(self.escape())
            else:
                made.append(self.peek())
                self.at += 1
        self.at += 1
        return "".join(made)

    def escape(self) -> str:
        char = self.text[self.at + 1]
        if char in "uUx":
            size = {"u": 4, "U": 8, "x": 2}[char]
            made = chr(int(self.text[self.at + 2 : self.at + 2 + size], 16))
            self.at += 2 + size
            return made
        self.at += 2
        return ESCAPES.get(char, char)

    def long_string(self, quote: str) -> str:
        self.at += 3
        start = self.at
        while self.at < len(self.text):
            if self.peek() == "\\" and quote == '"':
                self.at += 2
            elif self.peek(3) == quote * 3:
                break
            else:
                self.at += 1
        made = self.text[start : self.at]
        self.at += 3
        while self.peek() == quote and self.at < len(self.text):  # up to two more quotes belong to the text
            self.at += 1
        return made

    def value(self, path: Path) -> None:
        self.blanks(newlines=False)
        char = self.peek()
        if char in "\"'" and char:
            self.string()
        elif char == "[":
            self.array(path)
        elif char == "{":
            self.inline(path)
        else:
            while self.at < len(self.text) and self.peek() not in ",]}\n#":
                self.at += 1

    def array(self, path: Path) -> None:
        self.at += 1
        count = 0
        while True:
            self.blanks()
            if self.peek() in ("]", ""):
                break
            self.found.setdefault((*path, str(count)), self.line())
            self.value((*path, str(count)))
            count += 1
            self.blanks()
            if self.peek() == ",":
                self.at += 1
        self.at += 1

    def inline(self, path: Path) -> None:
        self.at += 1
        while True:
            self.blanks()
            if self.peek() in ("}", ""):
                break
            self.pair(path)
            self.blanks()
            if self.peek() == ",":
                self.at += 1
        self.at += 1
