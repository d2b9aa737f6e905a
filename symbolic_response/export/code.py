"""Programs as Python source: parts that are used twice become variables, in order."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from fractions import Fraction

from symbolic_response.export.names import Unused
from symbolic_response.export.program import (
    Applied,
    Constant,
    Monomial,
    Named,
    Node,
    Program,
    Root,
    Total,
    parts_of,
    reached,
)

WIDTH = 98
MAX_DEPTH = 12  # Python gives up at 100 nested parentheses
MAX_TERMS = 60
SUM, PRODUCT, ATOM = 0, 1, 2


class Source:
    """The statements that compute some roots of a program, and the roots as expressions.

    ``rational``: from fractions the statements give fractions.
    """

    def __init__(self, program: Program, roots: Sequence[int], hints: Mapping[int, str],
                 arguments: Mapping[str, str]) -> None:
        self.program, self.arguments = program, arguments
        self.variables: dict[int, str] = {}
        self.lines: list[str] = []
        self.unused = Unused([*arguments.values(), "Fraction"])
        self.depths: dict[int, int] = {}
        self.unnamed = 0
        order = list(reached(program, roots))
        self.symbols = [node.name for part in order
                        if isinstance(node := program.nodes[part], Named)]
        self.rational = not any(isinstance(program.nodes[p], Root | Applied) for p in order)
        uses = self._uses(order, roots)
        for part in order:
            self._place(part, uses[part], hints)
        self.results = [self._result(root) for root in roots]

    def _uses(self, order: Sequence[int], roots: Sequence[int]) -> dict[int, int]:
        uses = dict.fromkeys(order, 0)
        for part in order:
            for inner in parts_of(self.program.nodes[part]):
                uses[inner] += 1
        for root in roots:
            uses[root] += 1
        return uses

    def _place(self, part: int, uses: int, hints: Mapping[int, str]) -> None:
        node = self.program.nodes[part]
        self.depths[part] = 1 + max((self.depths[p] for p in parts_of(node)), default=0)
        if isinstance(node, Constant | Named):
            self.depths[part] = 0
            return
        shared = uses > 1 and not _is_small(node)
        if shared or part in self.program.kept or self.depths[part] > MAX_DEPTH:
            if part not in hints:
                self.unnamed += 1
            name = self.unused.take(hints.get(part, f"x{self.unnamed}"))
            self._assign(name, self.text(part))
            self.variables[part] = name
            self.depths[part] = 0

    def _assign(self, name: str, text: str) -> None:
        self.lines += wrapped(f"{name} = ", text)

    def _result(self, root: int) -> str:
        value = self.program.value(root)
        return _fraction(value) if value is not None else self.text(root)

    def text(self, part: int, level: int = SUM) -> str:
        """Return a part as an expression, in parentheses where ``level`` needs them."""
        if part in self.variables:
            return self.variables[part]
        match self.program.nodes[part]:
            case Constant(value):
                return str(value) if value.denominator == 1 and value >= 0 else _fraction(value)
            case Named(name):
                return self.arguments[name]
            case Total() as node:
                return self._sum(node, level)
            case Monomial(coefficient, factors):
                text = self._product(coefficient, factors)
                return f"({text})" if level > PRODUCT else text
            case Root(base, exponent):
                return self._root(base, exponent, level)
            case Applied(function, argument):
                return f"_{function}({self.text(argument)})"
        raise TypeError(f"no text for {self.program.nodes[part]}")

    def _root(self, base: int, exponent: Fraction, level: int) -> str:
        if exponent < 0:
            text = f"1/{self._root(base, -exponent, ATOM)}"
            return f"({text})" if level > PRODUCT else text
        text = f"_root({self.text(base)}, {exponent.denominator})"
        if exponent.numerator == 1:
            return text
        text += f"**{exponent.numerator}"
        return f"({text})" if level == ATOM else text

    def _sum(self, node: Total, level: int) -> str:
        bottom = node.constant.denominator  # a fraction beside an array would spoil it
        terms = sorted(node.terms, key=lambda term: term[0] < 0)
        pieces = [self._term(factor * bottom, part) for factor, part in terms]
        if node.constant > 0 and terms[0][0] < 0:
            pieces.insert(0, str(node.constant.numerator))
        elif node.constant:
            pieces.append(str(node.constant.numerator))
        while len(pieces) > MAX_TERMS:  # Python gives up at sums of a few thousand terms
            pieces = [f"({_joined(pieces[i:i + MAX_TERMS])})"
                      for i in range(0, len(pieces), MAX_TERMS)]
        text = _joined(pieces)
        if bottom > 1:
            text = f"({text})/{bottom}"
            return f"({text})" if level > PRODUCT else text
        return f"({text})" if level > SUM else text

    def _term(self, factor: Fraction, part: int) -> str:
        if part in self.variables or not isinstance(self.program.nodes[part], Monomial):
            return self._product(factor, ((part, 1),))
        node = self.program.nodes[part]
        assert isinstance(node, Monomial)
        return self._product(factor * node.coefficient, node.factors)

    def _product(self, coefficient: Fraction, factors: Sequence[tuple[int, int]]) -> str:
        above = [self._power(part, e) for part, e in factors if e > 0]
        below = [self._power(part, -e) for part, e in factors if e < 0]
        top, bottom = abs(coefficient.numerator), coefficient.denominator
        if top != 1 or not above:
            above.insert(0, str(top))
        if bottom != 1:
            below.insert(0, str(bottom))
        sign = "-" if coefficient < 0 else ""
        text = sign + "*".join(above)
        if not below:
            return text
        return f"{text}/{below[0]}" if len(below) == 1 else f"{text}/({'*'.join(below)})"

    def _power(self, part: int, exponent: int) -> str:
        body = self.text(part, ATOM)
        return body if exponent == 1 else f"{body}**{exponent}"


def _is_small(node: Node) -> bool:
    """Return whether a part is as short as its name would be: ``-a``, ``a*b``, ``1/a``."""
    return isinstance(node, Monomial) and sum(abs(e) for _, e in node.factors) <= 2 and (
        abs(node.coefficient) == 1)


def _fraction(value: Fraction) -> str:
    if value.denominator == 1:
        return f"Fraction({value.numerator})"
    return f"Fraction({value.numerator}, {value.denominator})"


def _joined(pieces: Sequence[str]) -> str:
    text = pieces[0]
    for piece in pieces[1:]:
        text += f" - {piece[1:]}" if piece.startswith("-") else f" + {piece}"
    return text


def wrapped(start: str, text: str, close: str = "") -> list[str]:
    """Return ``start + text + close`` as lines of at most 98 columns where blanks allow it."""
    if len(start) + len(text) + len(close) <= WIDTH:
        return [start + text + close]
    lines, line = [f"{start}("], "   "
    for word in text.split(" "):
        if len(line) + 1 + len(word) > WIDTH and line.strip():
            lines.append(line)
            line = "   "
        line += f" {word}"
    return [*lines, f"{line}){close}"]
