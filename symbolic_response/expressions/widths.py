r"""Widths of formulas, as TeX would set them in article at 10 pt.

TeX's own rules for a formula on one line (The TeXbook, appendix G) with a table of measured glyph
widths. Exact to about 0.01 pt for what the printers of this package write, except that the height
of a ``\left( \right)`` pair and of a root sign is assumed, never too small; a command that is not
in the table is taken as wide.
"""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass
from functools import cache

from symbolic_response.expressions.glyph_table import GLYPHS, KERNS

DISPLAY, TEXT, SCRIPT = 0, 1, 2
SCRIPT_SPACE, FRACTION_SPACE = 0.5, 2.4
UNKNOWN_WIDTH, WORD_SPACE = 14.0, 3.3334
ROOT_WIDTH = (10.0, 10.0, 8.34, 7.5)
TALL_PARENTHESIS = (7.37, 5.98, 5.98, 5.98)
_SIZED = {r"\bigl": 4.59, r"\bigr": 4.59, r"\Bigl": 5.98, r"\Bigr": 5.98}
_CLASSES = {
    "bin": r"+ - * \cdot \times \pm \mp \circ \ast \star \dagger \ddagger \oplus \otimes \bullet"
           r" \setminus \cup \cap",
    "rel": r"= < > : \to \rightarrow \leftarrow \leftrightarrow \rightleftharpoons \mid \neq \leq"
           r" \geq \le \ge \approx \sim \equiv \propto \uparrow \downarrow \in",
    "open": r"( [ \{ \langle", "close": r") ] ! \} \rangle", "punct": ", ;",
    "inner": r"\ldots \cdots", "space": r"\, \: \; \! \quad \qquad",
}
_CLASS = {glyph: kind for kind, glyphs in _CLASSES.items() for glyph in glyphs.split()}
_ORDER = ("ord", "op", "bin", "rel", "open", "close", "punct", "inner")
_SPACES = ("01230001", "11030001", "22002002", "33003003", "00000000", "01230001", "11011111",
           "11231011")
_ONLY_LARGE = {("op", "ord"), ("ord", "op"), ("op", "op"), ("close", "op"), ("inner", "op")}
_GAPS = (r"\,", r"\:", r"\;")
_OPERATORS = frozenset((r"\ln", r"\exp", r"\log", r"\tanh", r"\cosh", r"\sinh", r"\det", r"\arg"))
_ALPHABETS = {
    r"\mathrm": "rm:", r"\mathbf": "bf:",
    r"\boldsymbol": "bf:", r"\mathcal": "cal:", r"\mathit": "", r"\mathnormal": "",
}
_SWITCHES = {r"\rm": "rm:", r"\bf": "bf:", r"\it": ""}
_ACCENT_NAMES = (
    "hat bar tilde vec dot ddot check breve acute grave overline underline widehat widetilde"
)
_ACCENTS = frozenset(f"\\{name}" for name in _ACCENT_NAMES.split())
_TOKEN = re.compile(r"\\[A-Za-z]+|\\.|\S")


@dataclass(slots=True)
class _Atom:
    """One item of a formula; ``parts`` are formulas inside it, ``body`` says how they are set."""

    kind: str
    body: str
    glyph: str = ""
    parts: tuple[list[_Atom], ...] = ()
    below: list[_Atom] | None = None
    above: list[_Atom] | None = None
    fixed: float = 0.0


def formula_width(latex: str, *, style: int = DISPLAY) -> float:
    r"""Return the width in pt of a formula on one line.

    >>> round(formula_width(r"k_{\mathrm{on}} c"), 3)
    18.436
    """
    return _width(_parse(latex), style)


@cache
def _glyphs() -> dict[str, tuple[float, ...]]:
    rows = (line.split() for line in GLYPHS.strip().splitlines())
    return {key: tuple(float(value) for value in values) for key, *values in rows}


@cache
def _kerns() -> dict[str, tuple[float, ...]]:
    found = {}
    for line in KERNS.strip().splitlines():
        *values, pairs = line.split(maxsplit=3)
        found.update(dict.fromkeys(pairs.split(), tuple(float(value) for value in values)))
    return found


# -- reading -------------------------------------------------------------------------------------


def _parse(latex: str) -> list[_Atom]:
    reader = _Reader(_TOKEN.findall(latex))
    atoms = reader.formula("")
    while reader.place < len(reader.tokens):
        reader.place += 1
        atoms += reader.formula("")
    return atoms


@dataclass(slots=True)
class _Reader:
    tokens: list[str]
    place: int = 0

    def peek(self) -> str:
        return self.tokens[self.place] if self.place < len(self.tokens) else ""

    def take(self) -> str:
        token = self.peek()
        self.place += 1
        return token

    def formula(self, alphabet: str) -> list[_Atom]:
        """Read up to a closing brace, ``\\right`` or the end, which is left in place."""
        atoms: list[_Atom] = []
        while (token := self.peek()) and token not in ("}", r"\right"):
            if token in _SWITCHES:
                alphabet = _SWITCHES[self.take()]
            elif token in "_^'":
                self.scripts(atoms, alphabet)
            else:
                atoms.append(self.atom(alphabet))
        return atoms

    def scripts(self, atoms: list[_Atom], alphabet: str) -> None:
        if not atoms:
            atoms.append(_Atom("ord", "list", parts=([],)))
        token, last = self.take(), atoms[-1]
        if token == "'":
            last.above = [*(last.above or []), _Atom("ord", "glyph", r"\prime")]
        elif token == "^":
            last.above = [*(last.above or []), *self.argument(alphabet)]
        else:
            last.below = self.argument(alphabet)

    def argument(self, alphabet: str) -> list[_Atom]:
        if self.peek() != "{":
            return [self.atom(alphabet)] if self.peek() else []
        self.take()
        inside = self.formula(alphabet)
        self.take()
        return inside

    def atom(self, alphabet: str) -> _Atom:
        token = self.take()
        if token == "{":
            self.place -= 1
            return _group(self.argument(alphabet))
        if token in (r"\text", r"\textrm"):
            return _group([_in_text(atom) for atom in self.argument("rm:")])
        if token in _ALPHABETS:
            return _group(self.argument(_ALPHABETS[token]))
        if token in _ACCENTS:
            return _group(self.argument(alphabet))
        if token == r"\operatorname":
            return _Atom("op", "list", parts=(self.argument("rm:"),))
        if token in (r"\frac", r"\dfrac", r"\tfrac"):
            return _Atom("ord", token[1:], parts=(self.argument(alphabet),
                                                  self.argument(alphabet)))
        if token == r"\sqrt":
            return _Atom("ord", "root", parts=(self.argument(alphabet),))
        if token == r"\left":
            self.take()
            inside = self.formula(alphabet)
            self.place += 2
            return _Atom("inner", "tall", parts=(inside,))
        if token in _SIZED:
            self.take()
            return _Atom("open" if token.endswith("l") else "close", "fixed",
                         fixed=_SIZED[token])
        return _symbol(token, alphabet)


def _symbol(token: str, alphabet: str) -> _Atom:
    if token in _OPERATORS:
        letters = [_Atom("ord", "glyph", f"rm:{letter}") for letter in token[1:]]
        return _Atom("op", "list", parts=(letters,))
    if token in ("\\ ", "~"):
        return _Atom("space", "fixed", fixed=WORD_SPACE)
    glyph = alphabet + token if alphabet + token in _glyphs() else token
    if glyph not in _glyphs():
        return _Atom("ord", "fixed", fixed=UNKNOWN_WIDTH)
    return _Atom(_CLASS.get(token, "ord"), "glyph", glyph)


def _in_text(atom: _Atom) -> _Atom:
    """Return an atom as it stands in text, where a minus is a hyphen."""
    return _Atom("ord", "glyph", "rm:-") if atom.glyph == "-" else atom


def _group(inside: list[_Atom]) -> _Atom:
    """Return a braced formula; a lone ordinary glyph without scripts is just that glyph."""
    if len(inside) == 1:
        only = inside[0]
        if only.kind == "ord" and only.below is None and only.above is None:
            return only
    return _Atom("ord", "list", parts=(inside,))


# -- setting -------------------------------------------------------------------------------------


def _width(atoms: Sequence[_Atom], style: int) -> float:
    kinds = _kinds(atoms)
    total, previous = 0.0, ""
    for place, (atom, kind) in enumerate(zip(atoms, kinds, strict=True)):
        if kind != "space":
            if previous:
                total += _gap(previous, kind, style)
            previous = kind
        follower = atoms[place + 1] if place + 1 < len(atoms) else None
        total += _atom_width(atom, follower, style)
    return total


def _kinds(atoms: Sequence[_Atom]) -> list[str]:
    """Return the class of each atom, binary operations without two operands being ordinary."""
    kinds = [atom.kind for atom in atoms]
    last: int | None = None
    for place, kind in enumerate(kinds):
        if kind == "space":
            continue
        before = "" if last is None else kinds[last]
        if kind == "bin" and before in ("", "bin", "op", "rel", "open", "punct"):
            kinds[place] = "ord"
        elif kind in ("rel", "close", "punct") and before == "bin" and last is not None:
            kinds[last] = "ord"
        last = place
    if last is not None and kinds[last] == "bin":
        kinds[last] = "ord"
    return kinds


def _gap(left: str, right: str, style: int) -> float:
    size = int(_SPACES[_ORDER.index(left)][_ORDER.index(right)])
    if size == 0 or (style >= SCRIPT and (left, right) not in _ONLY_LARGE):
        return 0.0
    return _glyphs()[_GAPS[size - 1]][2 * max(0, style - 1)]


def _atom_width(atom: _Atom, follower: _Atom | None, style: int) -> float:
    alone, nucleus = _body_widths(atom, style)
    if atom.below is None and atom.above is None:
        return alone + _joined(atom, follower, alone, nucleus, style)
    script = min(3, max(SCRIPT, style + 1))
    below = 0.0 if atom.below is None else _width(atom.below, script) + SCRIPT_SPACE
    if atom.above is None:
        return nucleus + below
    above = _width(atom.above, script) + SCRIPT_SPACE
    return alone + above if atom.below is None else nucleus + max(below, above + alone - nucleus)


def _joined(
    atom: _Atom, follower: _Atom | None, alone: float, nucleus: float, style: int
) -> float:
    """Return what the next glyph of the same font changes: kerning, no italic correction."""
    if follower is None or atom.body != "glyph" or follower.body != "glyph":
        return 0.0
    upright = _is_upright(atom.glyph)
    if upright != _is_upright(follower.glyph) or atom.kind != "ord":
        return 0.0
    size = max(0, style - 1)
    if upright:
        kern = _kerns().get(atom.glyph + follower.glyph.removeprefix("rm:"))
        return nucleus - alone + (kern[size] if kern else 0.0)
    kern = _kerns().get(f"{atom.glyph},{follower.glyph}")
    return kern[size] if kern else 0.0


def _is_upright(glyph: str) -> bool:
    return glyph.startswith("rm:") or glyph.isdigit() or glyph in ("(", ")", "=", "+")


def _body_widths(atom: _Atom, style: int) -> tuple[float, float]:
    """Return the width of an atom without its scripts, alone and before a subscript."""
    size = max(0, style - 1)
    if atom.body == "glyph":
        row = _glyphs()[atom.glyph]
        return row[2 * size], row[2 * size + 1]
    if atom.body in ("frac", "dfrac", "tfrac"):
        inner = TEXT if atom.body == "dfrac" else min(3, style + 1)
        inner = SCRIPT if atom.body == "tfrac" else inner
        width = max(_width(part, inner) for part in atom.parts) + FRACTION_SPACE
    elif atom.body == "root":
        width = _width(atom.parts[0], style) + ROOT_WIDTH[style]
    elif atom.body == "tall":
        width = _width(atom.parts[0], style) + 2 * TALL_PARENTHESIS[style]
    elif atom.body == "fixed":
        width = atom.fixed
    else:
        width = _width(atom.parts[0], style)
    return width, width
