r"""Reading the displayed equations of a LaTeX file as hand results.

A statement ``QUANTITY = FORMULA`` is a hand result, each later part of a chain of equalities one
more. ``NAME = FORMULA`` with a name the network does not have defines an auxiliary quantity: in a
display, or within a line after a word such as "where", "with" or "define" in the same sentence. A
definition counts in the whole file, also before it stands; a name with two different definitions
counts nowhere. Everything else is passed over, with the reason, also a displayed definition
that nothing uses: it may have been meant as a result. A macro counts from where it is
defined to where it is defined again.
"""

from __future__ import annotations

import os
import re
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, field

from symbolic_response.errors import InputError, SymbolicResponseError
from symbolic_response.expressions.tree import Expression, Symbol
from symbolic_response.hand.latex.names import Names
from symbolic_response.hand.latex.reading import read_formula_tokens
from symbolic_response.hand.latex.tokens import Token, joined
from symbolic_response.hand.papers.auxiliary import (
    Auxiliary,
    check_size,
    is_name,
    resolve,
    used_names,
)
from symbolic_response.hand.papers.gathering import Gathered, Stated, gathered, one_line, shortened
from symbolic_response.network.notation_section import LETTERS
from symbolic_response.network.quantities import (
    Change,
    Current,
    DirectedRate,
    EntropyProduction,
    Mean,
    Probability,
    Response,
    Traffic,
    walk_quantity,
)

MAX_BYTES = 2_000_000
_ATOMS = (Probability, Mean, Current, Traffic, DirectedRate, EntropyProduction, Response, Change)
_BY_TIME = re.compile(r"\\d?frac\{(\\mathrm\{d\}|\\partial|d)[^{}]*(\{[^{}]*\})?[^{}]*\}"
                      r"\{(\\mathrm\{d\}|\\partial|d) ?t\}|\\(partial_\{?t|d?dot\b)")


@dataclass(frozen=True, slots=True)
class HandEquation:
    """A formula for a quantity; ``line`` counts from 1, ``label`` is that of its row."""

    quantity: Expression
    quantity_latex: str
    expression: Expression
    latex: str
    line: int
    label: str | None


@dataclass(frozen=True, slots=True)
class Definition:
    """An auxiliary quantity of the file, in symbols and atoms of the network."""

    latex: str
    expression: Expression
    line: int


@dataclass(frozen=True, slots=True)
class PassedOver:
    """Something of the file that is neither a hand result nor a definition, and why.

    ``unread``: a formula for a quantity of the network, which could not be read, or something that
    may hold one: a left side that begins with the letter of probabilities or currents and an index
    or superscript that the network does not have, a display of which ends or braces do not match
    or that is not read as a whole.
    """

    line: int
    excerpt: str
    reason: str
    unread: bool = False


@dataclass(frozen=True, slots=True)
class Reading:
    """What a file says, each part in the order of the file."""

    equations: tuple[HandEquation, ...]
    definitions: tuple[Definition, ...]
    passed_over: tuple[PassedOver, ...]


def read_equations_file(path: str | os.PathLike[str], names: Names) -> Reading:
    """Return what a LaTeX file of at most 2 MB says; see :func:`read_equations`.

    Raises InputError, in one line that begins with the file, where it cannot be read as UTF-8.
    """
    label = os.fsdecode(path)
    try:
        with open(label, "rb") as file:
            data = file.read(MAX_BYTES + 1)
    except IsADirectoryError:
        raise InputError(f"{label}: this is a folder; name the LaTeX file in it") from None
    except OSError as error:
        reason = (error.strerror or "it cannot be read").lower()
        raise InputError(f"{label}: {reason}; name a LaTeX file that can be read") from None
    except ValueError:
        raise InputError(f"{label!r} cannot be a file name; name a LaTeX file") from None
    if len(data) > MAX_BYTES:
        raise InputError(f"{label}: the file is longer than {MAX_BYTES} bytes; split it")
    try:
        text = data.decode("utf-8")
    except UnicodeDecodeError as error:
        line = data.count(b"\n", 0, error.start) + 1
        raise InputError(f"{label}:{line}: the byte 0x{data[error.start]:02x} is not UTF-8; "
                         "save the file as UTF-8") from None
    return read_equations(text, names)


def read_equations(text: str, names: Names) -> Reading:
    r"""Return the hand results of a LaTeX text, a whole document or a part of one.

    ``names``: the network's, from :func:`~symbolic_response.hand.latex.names.names_of`. Never
    raises for what stands in the text: a display that cannot be read is passed over.

    >>> from symbolic_response.hand.latex.names import names_of
    >>> from symbolic_response.network.build import build_network
    >>> pair = build_network("pair", states="A B", transitions=[("A", "B", "k*c", "r")])
    >>> found = read_equations(r"\[ p_B = \frac{k c}{Z}, \quad Z = r + k c \]", names_of(pair))
    >>> [(e.quantity_latex, e.latex, e.line) for e in found.equations]
    [('p_B', '\\frac{k c}{Z}', 1)]
    >>> [d.latex for d in found.definitions]
    ['Z']
    """
    text = text.removeprefix("\ufeff").replace("\r\n", "\n").replace("\r", "\n")
    file = _File(gathered(text), names)
    file.sort_out()
    return file.read()


@dataclass(slots=True)
class _File:
    """A file whose statements are gathered; those that define nothing wait in ``claims``."""

    parts: Gathered
    names: Names
    definitions: list[tuple[Auxiliary, Stated]] = field(default_factory=list)
    claims: list[Stated] = field(default_factory=list)
    passed: list[PassedOver] = field(default_factory=list)

    def sort_out(self) -> None:
        """Tell definitions from other statements."""
        for fault in self.parts.faults:
            self.passed.append(PassedOver(self.parts.line(fault.offset),
                                          self.parts.excerpt(fault.offset),
                                          one_line(fault.reason), fault.display))
        for stated in self.parts.stated:
            statement = stated.statement
            if statement.refusal is None and _defines(stated, self.names):
                equal = 1 + next((place for place, relation in enumerate(statement.relations)
                                  if relation != "="), len(statement.relations))
                auxiliary = Auxiliary(statement.parts[0], statement.parts[1:equal],
                                      stated.source, self.parts.line(stated.place()))
                self.definitions.append((auxiliary, stated))
            elif not stated.inline:
                self.claims.append(stated)

    def read(self) -> Reading:
        """Read what was sorted out."""
        names = resolve([auxiliary for auxiliary, _ in self.definitions], self.names)
        definitions = []
        used = self.used(names)
        for auxiliary, stated in self.definitions:
            if auxiliary.expression is None:
                self.pass_over(stated, auxiliary.refusal or "it cannot be read")
                continue
            definitions.append(Definition(stated.text(auxiliary.name), auxiliary.expression,
                                          auxiliary.line))
            if not stated.inline and auxiliary.key() not in used:
                self.pass_over(stated, "read as a definition, which nothing uses")
            for part in stated.statement.parts[1:]:
                if part is not auxiliary.used:
                    self.pass_over(stated, "another form of a definition is not compared", part)
        equations = [equation for stated in self.claims
                     for equation in self.equations(stated, names)]
        return Reading(tuple(equations), tuple(definitions),
                       tuple(sorted(self.passed, key=lambda passed: passed.line)))

    def used(self, names: Names) -> set[str]:
        """Return the keys of the names that formulas use, a definition not those of itself."""
        known = {joined(auxiliary.name): auxiliary.key() for auxiliary, _ in self.definitions}
        found = {key for stated in self.claims
                 for key in used_names(stated.statement.tokens, names, stated.source, known)}
        for auxiliary, stated in self.definitions:
            own = auxiliary.key()
            found |= {key for part in stated.statement.parts[1:]
                      for key in used_names(part, names, stated.source, known) if key != own}
        return found

    def pass_over(
        self, stated: Stated, reason: str | Exception, tokens: Sequence[Token] = (),
        unread: bool = False,
    ) -> None:
        """Note why a statement, or a part of it, is no hand result."""
        shown = stated.text(tokens or stated.statement.tokens)
        text = reason if isinstance(reason, str) else self.parts.reason(reason, stated.offset)
        self.passed.append(
            PassedOver(self.parts.line(stated.place(tokens)), shortened(shown), one_line(text),
                       unread))

    def equations(self, stated: Stated, names: Names) -> Iterator[HandEquation]:
        """Yield the hand results in a statement; pass over the rest of it."""
        statement = stated.statement
        quantity = self.left_side(stated, names)
        if quantity is None:
            return
        left, *rights = statement.parts
        for place, tokens in enumerate(rights):
            if statement.relations[place] != "=":
                self.pass_over(stated, f"what stands after {statement.relations[place]} is not "
                                       "compared", tokens)
                return
            expression = self.right_side(stated, tokens, quantity, names)
            if expression is not None:
                yield HandEquation(
                    quantity, stated.text(left), expression, stated.text(tokens),
                    self.parts.line(stated.place(tokens if place else left)), statement.label)

    def left_side(self, stated: Stated, names: Names) -> Expression | None:
        """Return the quantity left of the first ``=``, or say why there is none."""
        reason = stated.statement.refusal or _no_equation(stated)
        if reason is None:
            left = stated.statement.parts[0]
            try:
                quantity = read_formula_tokens(left, names, stated.source)
                check_size(quantity)
            except SymbolicResponseError as error:
                if _BY_TIME.search(joined(left)) is None:
                    self.pass_over(stated, error,
                                   unread=self.names.begins_unknown(left, stated.source))
                    return None
                reason = "a derivative by time is no quantity of a steady state"
            else:
                if _has_atoms(quantity):
                    return quantity
                reason = ("the left side is a symbol of the network: no hand result"
                          if isinstance(quantity, Symbol) else
                          "the left side holds no quantity of the network")
        self.pass_over(stated, reason)
        return None

    def right_side(
        self, stated: Stated, tokens: Sequence[Token], quantity: Expression, names: Names
    ) -> Expression | None:
        """Return a formula for the quantity, or say why it is none."""
        if not tokens:
            self.pass_over(stated, "nothing stands between two relations, or after the last")
            return None
        try:
            expression = read_formula_tokens(tokens, names, stated.source)
            check_size(expression)
        except SymbolicResponseError as error:
            self.pass_over(stated, error, tokens, unread=True)
            return None
        if _has_atoms(expression) and not isinstance(quantity, _ATOMS):
            self.pass_over(stated, "both sides hold quantities; write one of them alone on the "
                                   "left", tokens)
            return None
        return expression


def _has_atoms(expression: Expression) -> bool:
    return any(isinstance(part, _ATOMS) for part in walk_quantity(expression))


def _no_equation(stated: Stated) -> str | None:
    """Return why a statement cannot be an equation for a quantity."""
    statement = stated.statement
    if not statement.relations:
        return "there is no equals sign"
    if statement.relations[0] != "=":
        return f"{statement.relations[0]} is no equality"
    if not statement.parts[0]:
        return "nothing stands left of the equals sign"
    place = next((place for place, token in enumerate(statement.tokens)
                  if token.text == r"\begin"), None)
    if place is not None:
        name = joined(statement.tokens[place + 1 :]).partition("}")[0].lstrip("{")
        return f"the environment {name} within a formula is not read; write each case or row out"
    return None


def _defines(stated: Stated, names: Names) -> bool:
    """Return whether a statement defines a name that the network does not have."""
    statement = stated.statement
    left = statement.parts[0]
    if statement.relations[:1] != ("=",) or not is_name(left):
        return False
    subscripted = any(token.text == "_" for token in left)
    if subscripted and left[0].text in LETTERS["probability"] + LETTERS["current"][:1]:
        return False  # a state or transition that the network does not have
    try:
        read_formula_tokens(left, names, stated.source)
    except SymbolicResponseError:
        return True
    return False
