"""Gathering the statements of a LaTeX file: displays found, macros expanded, rows taken apart."""

from __future__ import annotations

import re
from bisect import bisect_left, bisect_right
from collections.abc import Sequence
from dataclasses import dataclass, field

from symbolic_response.errors import FormulaError, SymbolicResponseError
from symbolic_response.hand.latex.macros import MAX_EXPANSIONS, Macro, expand, take_definitions
from symbolic_response.hand.latex.tokens import Token, formula_error, tokenize
from symbolic_response.hand.papers.displays import READ, Display, Inline, find_displays
from symbolic_response.hand.papers.rows import statements
from symbolic_response.hand.papers.statements import Statement
from symbolic_response.hand.papers.visible import Fault, visible

MAX_DISPLAY = 50_000
MAX_STATEMENTS = 2_000
MAX_TOKENS = 300_000
MAX_MACRO_DEPTH = 50
MAX_MACRO = 20_000
_FAILED, _ENDLESS = 1_000, 100_000
_EXCERPT = 72
_SENTENCE = re.compile(
    r"\b(?:where|with|let|defin\w+|denot\w+|here|set|setting|introduc\w+)\b", re.IGNORECASE)
_SENTENCE_END = re.compile(r"[.!?](?=\s)|\n[ \t]*\n")


@dataclass(frozen=True, slots=True)
class Stated:
    """A statement, the part of the file it was read from (``raw``: its tokens) and its offset.

    ``inline``: it stands within a line, after a word such as "where".
    """

    statement: Statement
    source: str
    raw: Sequence[Token]
    offset: int
    inline: bool

    def text(self, tokens: Sequence[Token]) -> str:
        """Return tokens as they are written in the file, macros as they are called, on one line."""
        starts = {token.start for token in tokens}
        place = bisect_left(self.raw, min(starts), key=_start)
        last = max(starts)
        kept: list[Token] = []
        opened: list[int] = []
        for token in self.raw[place : place + MAX_DISPLAY]:
            if token.start > last and not opened:
                break
            if token.text == "{":
                opened.append(len(kept))
            if token.text == "}" and opened:
                before = opened.pop()  # braces around an argument stay where the argument does
                if len(kept) - before > 1 or token.start in starts:
                    kept.append(token)
                else:
                    del kept[before:]
            elif token.start in starts or token.text == "{":
                kept.append(token)
        pieces: list[str] = []
        for before_it, token in zip([None, *kept], kept, strict=False):
            apart = before_it is not None and before_it.end != token.start
            pieces.append((" " if apart else "") + self.source[token.start : token.end])
        return " ".join("".join(pieces).split())

    def place(self, tokens: Sequence[Token] = ()) -> int:
        """Return where in the file tokens begin, or else the statement."""
        first = (tokens or self.statement.tokens)[0]
        return self.offset + first.start


@dataclass(slots=True)
class Gathered:
    """The statements of a file and what is not read of it, by offsets in ``text``."""

    text: str
    stated: list[Stated] = field(default_factory=list)
    faults: list[Fault] = field(default_factory=list)
    _shown: str = ""
    _line_starts: list[int] = field(default_factory=list)
    _macros: dict[str, Macro] = field(default_factory=dict)
    _lengths: dict[str, int] = field(default_factory=dict)
    _tokens: int = 0

    def line(self, offset: int) -> int:
        """Return the line of an offset, from 1."""
        return bisect_right(self._line_starts, offset)

    def excerpt(self, offset: int) -> str:
        """Return what stands at an offset, to the end of its line."""
        end = self.text.find("\n", offset, offset + 2 * _EXCERPT)
        return shortened(self.text[offset : end if end >= 0 else offset + 2 * _EXCERPT])

    def reason(self, error: Exception, offset: int) -> str:
        """Return an error as one line; one in a part of the file that begins at ``offset`` with
        line and column in the file."""
        if not isinstance(error, FormulaError):
            return str(error)
        line = self.line(offset)
        column = error.column
        if error.line == 1:
            column += offset - self._line_starts[line - 1]
        return f"line {error.line + line - 1}, column {column}: {error.message}"

    def gather(self) -> None:
        """Take in the whole text."""
        self._line_starts = [0, *(mark.end() for mark in re.finditer("\n", self.text))]
        self._shown, faults = visible(self.text)
        found = find_displays(self._shown, self.text)
        self.faults += [*faults, *found.faults]
        parts: list[tuple[int, Display | Inline | None, int]] = [
            *((display.start, display, display.end) for display in found.displays),
            *((inline.start, inline, inline.end) for inline in found.inlines),
            *((start, None, end) for start, end in found.definitions),
        ]
        for start, part, end in sorted(parts, key=lambda entry: entry[0]):
            if isinstance(part, Display):
                self.display(part)
            elif isinstance(part, Inline):
                self.inline(part)
            else:
                self.definition(start, end)

    def definition(self, start: int, end: int) -> None:
        """Take in the definition of a macro; one of an environment is left alone."""
        source = self._shown[start:end]
        try:
            rest, macros = take_definitions(tokenize(source), source)
        except SymbolicResponseError as error:
            self.faults.append(Fault(start, self.reason(error, start)))
            return
        if source.startswith(r"\providecommand"):
            macros = {name: macro for name, macro in macros.items() if name not in self._macros}
        if rest and "environment" not in rest[0].text:
            self.faults.append(Fault(start, f"definitions by {rest[0].text} are not read; write "
                                            r"\newcommand"))
        self._macros |= macros
        self._lengths.clear()

    def display(self, display: Display) -> None:
        """Take in the statements of a display, or say why not."""
        reason, lost = None, True
        if display.environment not in READ | {"[", "$$"}:
            reason = f"the environment {display.environment} is not read; use equation or align"
        elif display.end - display.start > MAX_DISPLAY:
            reason = f"the display is longer than {MAX_DISPLAY} characters; split it"
        elif len(self.stated) >= MAX_STATEMENTS:
            reason = f"more than {MAX_STATEMENTS} statements stand before it; split the file"
        elif self._tokens > MAX_TOKENS:
            reason = (f"more than {MAX_TOKENS} tokens, or too many displays with faults, stand "
                      "before it; split the file")
        else:
            try:
                if not self.take(display.start, display.end, display.environment):
                    reason, lost = "the display holds no formula", False
            except SymbolicResponseError as error:
                self.charge(error)
                reason = self.reason(error, display.start)
        if reason is not None:
            self.faults.append(Fault(display.offset, reason, lost))

    def inline(self, inline: Inline) -> None:
        """Take in a formula within a line if a word before it says that it defines something."""
        start, end = inline.start, inline.end
        full = self._tokens > MAX_TOKENS or len(self.stated) >= MAX_STATEMENTS
        if full or end - start > MAX_DISPLAY or re.search(
                r"=|\\equiv", self._shown[start:end]) is None:
            return
        before = self._shown[max(inline.floor, start - 300) : start]
        if _SENTENCE.search(_SENTENCE_END.split(before)[-1]) is None:
            return
        try:
            self.take(start, end, "$")
        except SymbolicResponseError as error:
            self.charge(error)
            self.faults.append(Fault(start, self.reason(error, start)))

    def charge(self, error: Exception) -> None:
        """Count a display that failed as tokens, so that the time for all of them is bounded."""
        endless = f"{MAX_EXPANSIONS} calls" in str(error)
        self._tokens += _ENDLESS if endless else _FAILED

    def length(self, name: str, call: Token, source: str, depth: int = 1) -> int:
        """Return how many tokens a macro expands to, its arguments left out.

        Raises FormulaError for one that uses itself or is too long.
        """
        if name not in self._lengths:
            body = self._macros[name].body
            self._tokens += len(body)
            inner = [part.text for part in body if part.text in self._macros]
            length = len(body)
            for used in inner:
                if depth >= MAX_MACRO_DEPTH or length > MAX_MACRO:
                    raise formula_error(source, call.start, f"the macro {call.text} uses itself or "
                                        f"expands to more than {MAX_MACRO} tokens; write it out")
                length += self.length(used, call, source, depth + 1)
            self._lengths[name] = length
        return self._lengths[name]

    def take(self, start: int, end: int, environment: str) -> bool:
        """Take in the statements of a part of the file; return whether there are any."""
        source = self._shown[start:end]
        raw = tokenize(source)
        for token in raw:
            if token.text in self._macros:
                self.length(token.text, token, source)
        tokens = expand(raw, self._macros, source)
        self._tokens += len(tokens)
        found = statements(tokens, environment, source)
        self.stated += [Stated(each, source, raw, start, environment == "$") for each in found]
        return bool(found)


def _start(token: Token) -> int:
    return token.start


def gathered(text: str) -> Gathered:
    """Return the statements of a LaTeX text, and what is not read of it."""
    result = Gathered(text)
    result.gather()
    return result


def one_line(text: str) -> str:
    """Return a text on one line, what cannot be printed as a space."""
    return "".join(c if c.isprintable() else " " for c in " ".join(text.split()))


def shortened(text: str) -> str:
    """Return a text on one line, cut where it is long."""
    shown = one_line(text)
    return shown if len(shown) <= _EXCERPT else shown[:_EXCERPT] + "..."
