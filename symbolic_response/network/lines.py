"""Where in a TOML text each table, key and value begins.

The text is one that ``tomllib`` has accepted, so that only as much of the syntax is known here as
it takes to find one's way.
"""

from __future__ import annotations

import re
import tomllib
from collections.abc import Iterator
from dataclasses import dataclass, field

Place = tuple[str | int, ...]

_TOKEN = re.compile(
    r"(?P<space>[ \t\r]++|\#[^\n]*+)"
    r"|(?P<newline>\n)"
    r'|(?P<string>"""(?:[^"\\]++|\\.|"(?!""))*+""""{0,2}'
    r"|'''(?:[^']++|'(?!''))*+''''{0,2}"
    r'|"(?:[^"\\\n]++|\\.)*+"'
    r"|'[^'\n]*+')"
    r"|(?P<mark>[\[\]{}=,.])"
    r"|(?P<bare>[^\s\[\]{}=,.\"'#]++)"
    r"|(?P<other>.)",
    re.DOTALL,
)


def key_lines(text: str) -> dict[Place, int]:
    """Return the line, counted from 1, of each place: keys, and ordinals from 0, from the top.

    >>> key_lines("title = 'a'\\n[states.A]\\nenergy = 1")[("states", "A", "energy")]
    3
    """
    return _Scan(list(_tokens(text))).run()


def line_of(lines: dict[Place, int], place: Place) -> int:
    """Return the line of a place, or of the smallest known part of the document around it."""
    while place:
        if place in lines:
            return lines[place]
        place = place[:-1]
    return 1


@dataclass(frozen=True, slots=True)
class _Token:
    text: str
    line: int


def _tokens(text: str) -> Iterator[_Token]:
    line = 1
    for found in _TOKEN.finditer(text):
        if found.lastgroup != "space":
            yield _Token(found.group(), line)
        line += found.group().count("\n")
    yield _Token("\n", line)


@dataclass(slots=True)
class _Scan:
    tokens: list[_Token]
    index: int = 0
    lines: dict[Place, int] = field(default_factory=dict)
    arrays: dict[Place, int] = field(default_factory=dict)  # arrays of tables: their length

    def run(self) -> dict[Place, int]:
        table: Place = ()
        while self.index < len(self.tokens):
            token = self.tokens[self.index]
            if token.text == "\n":
                self.index += 1
            elif token.text == "[":
                table = self.header()
            else:
                self.value(table + self.key("="))
        return self.lines

    def note(self, place: Place, line: int) -> None:
        for length in range(1, len(place) + 1):
            self.lines.setdefault(place[:length], line)

    def key(self, end: str) -> Place:
        """Read a dotted key and the mark that ends it."""
        parts: list[str] = []
        while (token := self.tokens[self.index]).text != end:
            self.index += 1
            if token.text[0] in "\"'":
                parts.append(str(tomllib.loads(f"key = {token.text}")["key"]))
            elif token.text != ".":
                parts.append(token.text)
        self.index += 1
        return tuple(parts)

    def header(self) -> Place:
        line = self.tokens[self.index].line
        double = self.tokens[self.index + 1].text == "["
        self.index += 2 if double else 1
        table: Place = ()
        parts = self.key("]")
        for part in parts[:-1]:
            table = (*table, part)
            if table in self.arrays:
                table = (*table, self.arrays[table] - 1)
        table = (*table, parts[-1])
        if double:
            self.index += 1
            self.arrays[table] = self.arrays.get(table, 0) + 1
            table = (*table, self.arrays[table] - 1)
        self.note(table, line)
        return table

    def value(self, place: Place) -> None:
        """Read one value, whatever it holds, up to the end of its line."""
        line = self.tokens[self.index - 1].line  # of the equals sign
        self.note(place, line)
        opened: list[tuple[Place, int | None]] = []  # arrays with an ordinal, inline tables
        fresh = True  # a value may begin here
        while True:
            token = self.tokens[self.index]
            if token.text == "\n" and not opened:
                return
            self.index += 1
            if token.text == "\n":
                continue
            if token.text in ("]", "}"):
                opened.pop()
                fresh = False
                continue
            if token.text == "," and opened:
                inside, ordinal = opened.pop()
                opened.append((inside, None if ordinal is None else ordinal + 1))
                fresh = True
                continue
            if not fresh:
                continue  # the rest of a number or a date
            if opened and opened[-1][1] is None:
                self.index -= 1
                place = opened[-1][0] + self.key("=")
                self.note(place, token.line)
                token = self.tokens[self.index]
                self.index += 1
            elif opened:
                place = (*opened[-1][0], opened[-1][1] or 0)
                self.note(place, token.line)
            fresh = token.text in ("[", "{")
            if fresh:
                opened.append((place, 0 if token.text == "[" else None))
