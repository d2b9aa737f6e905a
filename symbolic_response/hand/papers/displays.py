r"""Finding the displayed and the inline formulas of a LaTeX file.

Read as displays: ``$$``, ``\[``, the environments of ``READ``, and macros or environments of the
file that stand for exactly one of these. Those of ``UNREAD`` are found and not read.
"""

from __future__ import annotations

import re
from collections.abc import Iterator
from dataclasses import dataclass, field

from symbolic_response.hand.papers.visible import Fault

_ONE = ("equation", "displaymath", "multline", "gather")
_COLUMNS = ("align", "flalign", "alignat", "xalignat", "xxalignat", "eqnarray")
READ = frozenset(name + star for name in _ONE + _COLUMNS for star in ("", "*"))
UNREAD = frozenset(
    name + star
    for name in ("dmath", "dgroup", "darray", "dseries", "IEEEeqnarray", "empheq", "numcases",
                 "subnumcases", "mathpar")
    for star in ("", "*")
)
DEFINING = frozenset((
    "newcommand", "renewcommand", "providecommand", "DeclareRobustCommand", "def", "gdef", "edef",
    "xdef", "DeclareMathOperator", "newenvironment", "renewenvironment", "NewDocumentCommand",
    "RenewDocumentCommand", "ProvideDocumentCommand",
))
_INPUTS = frozenset(("input", "include", "subfile"))
_MARK = re.compile(
    r"\\(?P<edge>begin|end)\s*\{(?P<name>[^{}\\\n]{1,60})\}"
    r"|(?P<dollar>\$\$?)|\\(?P<bracket>[\[\]()])|\\(?P<word>[A-Za-z]+)|\\."
    r"|(?P<blank>\n[ \t]*(?=\n))",
    re.DOTALL,
)
_ALIAS = re.compile(r"\s*(?:\\(begin|end)\s*\{([^{}\\]+)\}|\\([\[\]])|(\$\$))\s*")
_HEAD = re.compile(r"\*?\s*(?:\{\s*\\([A-Za-z]+|.)\s*\}|\\([A-Za-z]+|.)|\{([A-Za-z*]+)\})\s*",
                   re.DOTALL)
_WITHIN_WORDS = re.compile(r"[^$\n]{0,300}\$(?!\$)")
_OPTION = re.compile(r"\s*\[[^\[\]]*\]")
_OF_DISPLAY = re.compile(r"\\begin\s*\{(" + "|".join(
    re.escape(name) for name in sorted(READ | UNREAD, key=len, reverse=True)) + r")\}|\\\[|\$\$")


@dataclass(frozen=True, slots=True)
class Display:
    """A displayed formula; ``start`` to ``end`` is what stands between its two ends."""

    environment: str
    offset: int
    start: int
    end: int
    after: int


@dataclass(frozen=True, slots=True)
class Inline:
    """A formula within a line; ``floor`` is where the display before it ends."""

    start: int
    end: int
    floor: int


@dataclass(frozen=True, slots=True)
class Found:
    """The formulas of a file in their order, its definitions of macros, and what is not read."""

    displays: tuple[Display, ...]
    inlines: tuple[Inline, ...]
    definitions: tuple[tuple[int, int], ...]
    faults: tuple[Fault, ...]


def find_displays(text: str, original: str) -> Found:
    r"""Return the formulas of a text from :func:`visible.visible`; ``original`` before blanking.

    Each opening of a display gives a Display or a Fault. An unclosed one ends where TeX would
    stop: at a blank line, at the next display, or at the end.

    >>> find_displays("so $$a = b$$ and $c$", "so $$a = b$$ and $c$").displays
    (Display(environment='$$', offset=3, start=5, end=10, after=12),)
    """
    scan = _Scan(text, original, dict(_pairs(text)))
    at: int | None = 0
    while at is not None and (mark := _MARK.search(text, at)) is not None:
        at = scan.take(mark)
    scan.stop()
    return Found(tuple(scan.displays), tuple(scan.inlines), tuple(scan.definitions),
                 tuple(sorted(scan.faults, key=lambda fault: fault.offset)))


def _pairs(text: str) -> Iterator[tuple[int, int]]:
    """Yield the places of matching braces."""
    opened: list[int] = []
    for mark in re.finditer(r"\\.|[{}]", text, re.DOTALL):
        if mark[0] == "{":
            opened.append(mark.start())
        elif mark[0] == "}" and opened:
            yield opened.pop(), mark.start()


@dataclass(frozen=True, slots=True)
class _Edge:
    """One end of a display: its environment (or ``$$`` or ``[``) and how it is written."""

    opens: bool
    environment: str
    written: str


@dataclass(slots=True)
class _Scan:
    text: str
    original: str
    braces: dict[int, int]
    aliases: dict[str, _Edge] = field(default_factory=dict)
    environments: dict[str, str] = field(default_factory=dict)
    makers: set[str] = field(default_factory=set)
    displays: list[Display] = field(default_factory=list)
    inlines: list[Inline] = field(default_factory=list)
    definitions: list[tuple[int, int]] = field(default_factory=list)
    faults: list[Fault] = field(default_factory=list)
    display: tuple[_Edge, int, int] | None = None
    inline: tuple[str, int] | None = None
    floor: int = 0

    def take(self, mark: re.Match[str]) -> int | None:
        """Note one mark; return where to go on, or None at the end of the document."""
        if mark["word"] in DEFINING and self.display is None and self.inline is None:
            return self.definition(mark["word"], mark.start(), mark.end())
        over = mark["edge"] == "end" and mark["name"] == "document"
        if over or (mark["blank"] is not None and self.original[mark.start() : mark.end() + 1]
                    == self.text[mark.start() : mark.end() + 1]):
            self.stop()
            return None if over else mark.end()
        edge = self.edge(mark)
        if self.display is not None:
            return self.within(mark, edge)
        if self.inline is not None and self.closes_inline(mark, edge):
            return mark.start() + 1 if mark["dollar"] == "$$" else mark.end()
        if edge is not None and edge.opens:
            self.open(edge, mark)
        elif edge is not None:
            self.faults.append(Fault(mark.start(), f"{edge.written} closes no display; remove it",
                                     True))
        elif self.inline is None:
            self.outside(mark)
        return mark.end()

    def edge(self, mark: re.Match[str]) -> _Edge | None:
        """Return the end of a display that a mark is, or None."""
        if mark["edge"]:
            name = self.environments.get(mark["name"], mark["name"])
            if name in READ or name in UNREAD or name == "":
                written = f"\\{mark['edge']}{{{mark['name']}}}"
                return _Edge(mark["edge"] == "begin", name or mark["name"], written)
        if mark["bracket"] in ("[", "]"):
            return _Edge(mark["bracket"] == "[", "[", mark[0])
        if mark["dollar"] == "$$" and self.inline is None:
            return _Edge(self.display is None, "$$", "$$")
        if mark["word"] in self.aliases:
            alias = self.aliases[mark["word"]]
            opens = self.display is None if alias.environment == "$$" else alias.opens
            return _Edge(opens, alias.environment, mark[0])
        return None

    def within(self, mark: re.Match[str], edge: _Edge | None) -> int:
        """Go on within a display."""
        assert self.display is not None
        opening, offset, start = self.display
        if edge is None:
            if mark["dollar"] == "$" and opening.environment == "$$":
                words = _WITHIN_WORDS.match(self.text, mark.end())
                return words.end() if words else mark.end()
            return mark.end()
        if edge.opens or edge.environment != opening.environment:
            self.stop()
            return mark.start() if edge.opens or edge.environment == "$$" else mark.end()
        self.displays.append(Display(opening.environment, offset, start, mark.start(), mark.end()))
        self.display, self.floor = None, mark.end()
        return mark.end()

    def closes_inline(self, mark: re.Match[str], edge: _Edge | None) -> bool:
        """Close a formula within a line, at its end or where a display begins; say if at its end"""
        assert self.inline is not None
        closing, start = self.inline
        if (mark["dollar"] and closing == "$") or (mark["bracket"] == ")" and closing == ")"):
            self.inlines.append(Inline(start, mark.start(), self.floor))
            self.inline = None
            return True
        if edge is not None and edge.opens:
            self.stop()
        return False

    def open(self, edge: _Edge, mark: re.Match[str]) -> None:
        self.display = (edge, mark.start(), mark.end())

    def outside(self, mark: re.Match[str]) -> None:
        """Note what stands outside of formulas."""
        if mark["dollar"] or mark["bracket"] == "(":
            self.inline = ("$" if mark["dollar"] else ")", mark.end())
        elif mark["word"] in self.makers:
            self.faults.append(Fault(mark.start(), f"the display that {mark[0]} makes is not read;"
                                                   " write the display itself", True))
        elif mark["word"] in _INPUTS:
            named = re.compile(r"[ \t]*(?:\{[^{}\n]{0,200}\}|[^\s{}\\]{1,200})").match(
                self.text, mark.end())
            if named is not None:
                self.faults.append(Fault(mark.start(), f"{mark[0]}{named[0].rstrip()} is not "
                                                       "followed; compare that file by itself"))

    def stop(self) -> None:
        """Give up the formula that is open, where TeX would."""
        if self.display is not None:
            edge, offset, _ = self.display
            closing = {"[": r"\]", "$$": "$$"}.get(edge.environment, f"\\end{{{edge.environment}}}")
            self.faults.append(Fault(offset, f"{edge.written} is not closed; write {closing} "
                                             "before the next blank line or display", True))
        elif self.inline is not None:
            closing, start = self.inline
            written = "$" if closing == "$" else r"\("
            ends = "$" if closing == "$" else r"\)"
            self.faults.append(Fault(start - len(written), f"{written} is not closed; write {ends}"
                                                           " in the same paragraph"))
        self.display = self.inline = None

    # -- definitions ---------------------------------------------------------------------------

    def definition(self, word: str, start: int, end: int) -> int:
        """Skip a definition of a macro or environment, noting one that stands for a display."""
        head = _HEAD.match(self.text, end)
        if head is None:
            return end
        name, at = head[1] or head[2] or head[3], head.end()
        if word.endswith("def"):
            at = self.text.find("{", at, at + 200)
        bodies: list[str] = []
        for _ in range(2 if "environment" in word or "Document" in word else 1):
            while (option := _OPTION.match(self.text, at)) is not None:
                at = option.end()
            while self.text[at : at + 1].isspace():
                at += 1
            closing = self.braces.get(at)
            if closing is None:
                self.faults.append(Fault(start, f"the definition of {name} has no body in balanced "
                                                "braces; close its braces"))
                return max(at, end)
            bodies.append(self.text[at + 1 : closing])
            at = closing + 1
        self.definitions.append((start, at))
        if "environment" in word:
            self.environment(name, bodies[0])
        else:
            self.macro(name, bodies[-1])
        return at

    def macro(self, name: str, body: str) -> None:
        self.aliases.pop(name, None)
        self.makers.discard(name)
        alias = _ALIAS.fullmatch(body)
        if alias is not None:
            edge, environment, bracket, dollars = alias.groups()
            environment = self.environments.get(environment, environment)
            if bracket or dollars or environment in READ or environment in UNREAD:
                self.aliases[name] = _Edge(edge == "begin" or bracket == "[",
                                           "$$" if dollars else environment or "[", "\\" + name)
        elif _OF_DISPLAY.search(body):
            self.makers.add(name)

    def environment(self, name: str, begins: str) -> None:
        alias = _ALIAS.fullmatch(begins)
        if alias is not None and alias[2] in READ:
            self.environments[name] = alias[2]
        elif _OF_DISPLAY.search(begins):
            self.environments[name] = ""
