"""Straight-line programs: expressions in which every part that occurs twice is one part.

A part is a number, the place of its node in the program. Equal parts are the same number, so that
long sums over trees and the steps of an elimination are written, differentiated and computed once.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator, Sequence
from dataclasses import dataclass
from fractions import Fraction

from symbolic_response.errors import EvaluationError, SizeLimitError
from symbolic_response.expressions import tree

MAX_NODES = 200_000

Term = tuple[Fraction, int]
Factor = tuple[int, int]


@dataclass(frozen=True, slots=True)
class Constant:
    """An exact number."""

    value: Fraction


@dataclass(frozen=True, slots=True)
class Named:
    """A symbol of the file."""

    name: str


@dataclass(frozen=True, slots=True)
class Rate:
    """A directed rate, kept apart from its expression so that perturbations reach it."""

    transition: int
    backward: bool


@dataclass(frozen=True, slots=True)
class Total:
    """A constant plus a sum of coefficients times parts, in the order they are shown."""

    constant: Fraction
    terms: tuple[Term, ...]


@dataclass(frozen=True, slots=True)
class Monomial:
    """A coefficient times a product of integer powers of parts."""

    coefficient: Fraction
    factors: tuple[Factor, ...]


@dataclass(frozen=True, slots=True)
class Root:
    """A part to a power that is no integer."""

    base: int
    exponent: Fraction


@dataclass(frozen=True, slots=True)
class Applied:
    """``exp`` or ``ln`` of a part."""

    function: str
    argument: int


Node = Constant | Named | Rate | Total | Monomial | Root | Applied


class Program:
    """The nodes made so far. ``kept`` parts stay whole inside products, to be named."""

    def __init__(self) -> None:
        self.nodes: list[Node] = []
        self.kept: set[int] = set()
        self._places: dict[object, int] = {}

    def _place(self, key: object, node: Node) -> int:
        if key not in self._places:
            if len(self.nodes) >= MAX_NODES:
                raise SizeLimitError(f"the functions need more than {MAX_NODES} steps; ask for"
                                     " fewer quantities, or for exact values with derive --at")
            self._places[key] = len(self.nodes)
            self.nodes.append(node)
        return self._places[key]

    def number(self, value: int | Fraction) -> int:
        """Return an exact number."""
        return self._place(("number", Fraction(value)), Constant(Fraction(value)))

    def symbol(self, name: str) -> int:
        """Return a symbol of the file."""
        return self._place(Named(name), Named(name))

    def rate(self, transition: int, backward: bool) -> int:
        """Return a directed rate."""
        return self._place(Rate(transition, backward), Rate(transition, backward))

    def value(self, part: int) -> Fraction | None:
        """Return the number that a part is, None for others."""
        node = self.nodes[part]
        return node.value if isinstance(node, Constant) else None

    def keep(self, part: int) -> int:
        """Mark a part as one that is named, and return it."""
        if isinstance(self.nodes[part], Total | Monomial):
            self.kept.add(part)
        return part

    def _split(self, part: int) -> tuple[Fraction, int]:
        """Return the coefficient of a part and the rest."""
        node = self.nodes[part]
        if part in self.kept or not isinstance(node, Monomial) or node.coefficient == 1:
            return Fraction(1), part
        return node.coefficient, self._monomial(Fraction(1), dict(node.factors))

    def add(self, terms: Iterable[tuple[int | Fraction, int]]) -> int:
        """Return a sum of coefficients times parts."""
        constant, gathered = Fraction(0), dict[int, Fraction]()
        for factor, part in terms:
            node = self.nodes[part]
            if isinstance(node, Constant):
                constant += factor * node.value
            elif isinstance(node, Total) and part not in self.kept:
                constant += factor * node.constant
                for inner, piece in node.terms:
                    gathered[piece] = gathered.get(piece, Fraction(0)) + factor * inner
            else:
                inner, piece = self._split(part)
                gathered[piece] = gathered.get(piece, Fraction(0)) + factor * inner
        kept = [(factor, part) for part, factor in gathered.items() if factor]
        if not kept:
            return self.number(constant)
        if len(kept) == 1 and not constant:
            ((factor, part),) = kept
            return self.multiply([(part, 1)], factor)
        return self._place(("sum", constant, frozenset(kept)), Total(constant, tuple(kept)))

    def multiply(
        self, factors: Iterable[tuple[int, int]], coefficient: int | Fraction = 1
    ) -> int:
        """Return a coefficient times integer powers of parts; EvaluationError for 1/0."""
        lead, gathered = Fraction(coefficient), dict[int, int]()
        for part, exponent in factors:
            node = self.nodes[part]
            if isinstance(node, Constant):
                if node.value == 0 and exponent < 0:
                    raise EvaluationError("division by zero")
                lead *= node.value**exponent
            elif isinstance(node, Monomial) and part not in self.kept:
                lead *= node.coefficient**exponent
                for inner, step in node.factors:
                    gathered[inner] = gathered.get(inner, 0) + step * exponent
            else:
                gathered[part] = gathered.get(part, 0) + exponent
        return self._monomial(lead, {part: step for part, step in gathered.items() if step})

    def _monomial(self, lead: Fraction, factors: dict[int, int]) -> int:
        if lead == 0 or not factors:
            return self.number(lead)
        if lead == 1 and len(factors) == 1 and 1 in factors.values():
            return next(iter(factors))
        key = ("product", lead, frozenset(factors.items()))
        return self._place(key, Monomial(lead, tuple(factors.items())))

    def power(self, base: int, exponent: Fraction) -> int:
        """Return a rational power of a part."""
        if exponent.denominator == 1:
            return self.multiply([(base, exponent.numerator)])
        value = self.value(base)
        if value is not None and value in (0, 1) and exponent > 0:
            return base
        return self._place(("root", base, exponent), Root(base, exponent))

    def apply(self, function: str, argument: int) -> int:
        """Return ``exp`` or ``ln`` of a part; ``exp(2*ln(a) + b)`` as ``a**2*exp(b)``."""
        value = self.value(argument)
        if function == "exp" and (powers := self._logarithms(argument)):
            pieces = [(self.power(self._argument(term), factor), 1) for factor, term in powers]
            rest = self.add([(1, argument), *((-factor, term) for factor, term in powers)])
            return self.multiply([*pieces, (self.apply("exp", rest), 1)])
        if value is not None and value == (0 if function == "exp" else 1):
            return self.number(1 if function == "exp" else 0)
        return self._place((function, argument), Applied(function, argument))

    def _logarithms(self, part: int) -> list[Term]:
        """Return the terms of a sum that are a number times a logarithm."""
        node = self.nodes[part]
        if part in self.kept:
            return []
        terms = node.terms if isinstance(node, Total) else (self._split(part),)
        return [term for term in terms if self._is_logarithm(term[1])]

    def _is_logarithm(self, part: int) -> bool:
        node = self.nodes[part]
        return isinstance(node, Applied) and node.function == "ln"

    def _argument(self, part: int) -> int:
        node = self.nodes[part]
        assert isinstance(node, Applied)
        return node.argument


Leaf = Callable[[tree.Expression], int]


def translated(program: Program, node: tree.Expression, leaf: Leaf) -> int:
    """Return an expression tree as a part of the program; ``leaf`` is asked for other leaves."""
    match node:
        case tree.Number(value):
            return program.number(value)
        case tree.Symbol(name):
            return program.symbol(name)
        case tree.Sum(terms):
            return program.add([(1, translated(program, term, leaf)) for term in terms])
        case tree.Product(factors):
            return program.multiply([(translated(program, f, leaf), 1) for f in factors])
        case tree.Power(base, exponent):
            return program.power(translated(program, base, leaf), exponent)
        case tree.Function(name, argument):
            return program.apply(name, translated(program, argument, leaf))
    return leaf(node)


def parts_of(node: Node) -> tuple[int, ...]:
    """Return the parts of a node."""
    match node:
        case Total(_, terms):
            return tuple(part for _, part in terms)
        case Monomial(_, factors):
            return tuple(part for part, _ in factors)
        case Root(base, _):
            return (base,)
        case Applied(_, argument):
            return (argument,)
    return ()


def reached(program: Program, roots: Sequence[int]) -> Iterator[int]:
    """Yield every part that some roots need, the parts of a node before the node, each once."""
    seen: set[int] = set()
    stack = [(root, False) for root in reversed(roots)]
    while stack:
        part, ready = stack.pop()
        if ready:
            yield part
        elif part not in seen:
            seen.add(part)
            stack.append((part, True))
            stack += [(p, False) for p in reversed(parts_of(program.nodes[part])) if p not in seen]


def operations(program: Program, roots: Sequence[int]) -> int:
    """Return the number of operations that some roots need, what they share counted once."""
    total = 0
    for part in reached(program, roots):
        match program.nodes[part]:
            case Total(constant, terms):
                total += len(terms) - 1 + (constant != 0)
                total += sum(abs(factor) != 1 for factor, _ in terms)
            case Monomial(coefficient, factors):
                total += len(factors) - 1 + (abs(coefficient) != 1)
                total += sum(abs(exponent) != 1 for _, exponent in factors)
            case Root() | Applied():
                total += 1
    return total


def rebuilt(target: Program, source: Program, roots: Sequence[int], leaf: Callable[[Node], int]
            ) -> list[int]:
    """Return the roots with each number, symbol and rate replaced by ``leaf`` in ``target``."""
    made: dict[int, int] = {}
    for part in reached(source, roots):
        node = source.nodes[part]
        match node:
            case Total(constant, terms):
                pieces = [(factor, made[piece]) for factor, piece in terms]
                made[part] = target.add([(constant, target.number(1)), *pieces])
            case Monomial(coefficient, factors):
                made[part] = target.multiply([(made[p], e) for p, e in factors], coefficient)
            case Root(base, exponent):
                made[part] = target.power(made[base], exponent)
            case Applied(function, argument):
                made[part] = target.apply(function, made[argument])
            case _:
                made[part] = leaf(node)
        if part in source.kept:
            target.keep(made[part])
    return [made[root] for root in roots]


def differentiated(program: Program, root: int, leaf: Callable[[Node], int]) -> int:
    """Return the derivative of a part, given those of symbols and rates."""
    zero, changes = program.number(0), dict[int, int]()
    for part in list(reached(program, [root])):
        node = program.nodes[part]
        match node:
            case Constant():
                changes[part] = zero
            case Total(_, terms):
                changes[part] = program.add([(f, changes[piece]) for f, piece in terms])
            case Monomial(coefficient, factors):
                changes[part] = program.add([
                    (e, program.multiply([
                        *((other, f - (other == piece)) for other, f in factors),
                        (changes[piece], 1)], coefficient))
                    for piece, e in factors if changes[piece] != zero])
            case Root(base, exponent):
                slope = program.power(base, exponent - 1)
                changes[part] = program.multiply([(slope, 1), (changes[base], 1)], exponent)
            case Applied("exp", argument):
                changes[part] = program.multiply([(part, 1), (changes[argument], 1)])
            case Applied(_, argument):
                changes[part] = program.multiply([(changes[argument], 1), (argument, -1)])
            case _:
                changes[part] = leaf(node)
        if part in program.kept:
            program.keep(changes[part])
    return changes[root]
