r"""What TeX would set of a LaTeX file: comments, verbatim text and dead branches blanked out.

Every character keeps its place. Only ``\iffalse`` and ``\iftrue`` are decided; of other
conditionals both branches stay.
"""

from __future__ import annotations

import re
from dataclasses import dataclass, field

_RAW = (
    r"verbatim\*?|Verbatim\*?|BVerbatim|LVerbatim|lstlisting|minted|comment|filecontents\*?"
    r"|alltt|luacode\*?"
)
_MARK = re.compile(
    rf"\\begin[ \t]*\{{(?P<raw>{_RAW})\}}"
    r"|\\(?P<verb>verb\*?|lstinline)(?![A-Za-z])"
    r"|\\(?P<address>url|path|nolinkurl|href)[ \t]*\{"
    r"|\\newif\s*\\(?P<declared>[A-Za-z]+)"
    r"|\\(?P<word>[A-Za-z]+)|\\.|(?P<comment>%[^\n]*)",
    re.DOTALL,
)
_CONDITIONALS = frozenset((
    "if", "ifcase", "ifcat", "ifcsname", "ifdefined", "ifdim", "ifeof", "iffalse", "ifhbox",
    "ifhmode", "ifinner", "ifmmode", "ifnum", "ifodd", "iftrue", "ifvbox", "ifvmode", "ifvoid",
    "ifx", "ifpdf", "ifluatex", "ifxetex",
))


@dataclass(frozen=True, slots=True)
class Fault:
    """Something of a file that is not read: where it begins, from 0, and why.

    ``display``: displays may be lost by it.
    """

    offset: int
    reason: str
    display: bool = False


def visible(text: str) -> tuple[str, tuple[Fault, ...]]:
    r"""Return the text with what TeX does not set replaced by spaces, and what never ends.

    >>> visible(r"50\% of a % note")[0]
    '50\\% of a       '
    """
    state = _State(text)
    at = 0
    while (mark := _MARK.search(text, at)) is not None:
        at = state.take(mark)
    state.finish()
    pieces, done = [], 0
    for start, end in state.hidden:
        pieces += [text[done:start], re.sub(r"[^\n]", " ", text[start:end])]
        done = end
    return "".join([*pieces, text[done:]]), tuple(state.faults)


@dataclass(slots=True)
class _State:
    """Where the scan stands: open conditionals, and the dead branch it is in, if any."""

    text: str
    hidden: list[tuple[int, int]] = field(default_factory=list)
    faults: list[Fault] = field(default_factory=list)
    declared: set[str] = field(default_factory=set)
    open: list[str] = field(default_factory=list)
    dead: int | None = None
    depth: int = 0

    def take(self, mark: re.Match[str]) -> int:
        """Note one mark; return where to go on."""
        start, end = mark.span()
        if mark["declared"]:
            self.declared.add(mark["declared"])
        if mark["word"]:
            self.word(mark["word"], start, end)
            return end
        if mark["comment"]:
            pass
        elif mark["raw"]:
            end = self.raw(mark["raw"], start, end)
        elif mark["verb"]:
            end = self.verb(end)
        elif mark["address"]:
            closing = self.text.find("}", end)
            start, end = end, closing if closing >= 0 else end
        else:
            return end
        if self.dead is None:
            self.hidden.append((start, end))
        return end

    def raw(self, name: str, start: int, end: int) -> int:
        closing = rf"\end{{{name}}}"
        found = self.text.find(closing, end)
        if found >= 0:
            return found + len(closing)
        if self.dead is None:
            self.faults.append(
                Fault(start, rf"\begin{{{name}}} is not closed; write {closing} after it", True))
        return len(self.text)

    def verb(self, end: int) -> int:
        delimiter = self.text[end : end + 1]
        line_end = self.text.find("\n", end)
        closing = self.text.find("}" if delimiter == "{" else delimiter, end + 1,
                                 line_end if line_end >= 0 else len(self.text))
        return closing + 1 if closing >= 0 else end

    def word(self, word: str, start: int, end: int) -> None:
        """Follow conditionals; a dead branch is hidden with the words around it."""
        opens = word in _CONDITIONALS or word in self.declared
        if self.dead is not None:
            if opens:
                self.depth += 1
            elif word == "fi":
                self.depth -= 1
            if self.depth == 0 or (word == "else" and self.depth == 1
                                   and self.open[-1] == "iffalse"):
                self.hidden.append((self.dead, end))
                self.dead = None
                self.open.pop()
                if word == "else":
                    self.open.append("alive")
        elif opens:
            self.open.append(word)
            if word == "iffalse":
                self.dead, self.depth = start, 1
            elif word == "iftrue":
                self.hidden.append((start, end))
        elif word == "else" and self.open and self.open[-1] == "iftrue":
            self.dead, self.depth = start, 1
        elif word == "fi" and self.open and self.open.pop() in ("iftrue", "alive"):
            self.hidden.append((start, end))

    def finish(self) -> None:
        if self.dead is not None:
            self.hidden.append((self.dead, len(self.text)))
            self.faults.append(Fault(
                self.dead, rf"\{self.open[-1]} is not closed; write \fi after what it leaves out",
                True))
