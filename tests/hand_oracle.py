"""Steady states, responses and formulas at a point with SymPy's rationals alone: an oracle.

Nothing of the package computes here: nodes are read, W p = 0 and W p' = -W' p are solved by
elimination, formulas are evaluated by substitution.
"""

from __future__ import annotations

from collections.abc import Mapping
from fractions import Fraction

import sympy

from symbolic_response.expressions.tree import (
    Expression,
    Function,
    Number,
    Power,
    Product,
    Sum,
    Symbol,
)
from symbolic_response.network.model import Network
from symbolic_response.network.quantities import (
    BarrierOf,
    Current,
    DirectedRate,
    DriveOf,
    EnergyOf,
    EntropyProduction,
    Mean,
    Probability,
    Response,
    Traffic,
)
from tests.random_networks import eliminated

Point = Mapping[str, sympy.Expr]


def point_of(values: Mapping[str, Expression]) -> dict[str, sympy.Expr]:
    """Return the values of a witness, which are constants."""
    return {name: plain(value, {}) for name, value in values.items()}


def plain(node: Expression, at: Point) -> sympy.Expr:
    """Return an expression of symbols at a point."""
    match node:
        case Number(value):
            return sympy.Rational(value.numerator, value.denominator)
        case Symbol(name):
            return at[name]
        case Sum(terms):
            return sympy.Add(*(plain(term, at) for term in terms))
        case Product(factors):
            return sympy.Mul(*(plain(factor, at) for factor in factors))
        case Power(base, exponent):
            return plain(base, at) ** sympy.Rational(exponent.numerator, exponent.denominator)
        case Function("exp", argument):
            return sympy.exp(sympy.expand(plain(argument, at)))
        case Function(_, argument):
            return sympy.log(plain(argument, at))
    raise TypeError(type(node).__name__)


class Oracle:
    """A network at a point where all rates are rational."""

    def __init__(self, network: Network, at: Point) -> None:
        self.network, self.at = network, at
        self.rates = {(e, back): self._rate(rate)
                      for e, t in enumerate(network.transitions)
                      for back, rate in ((False, t.forward), (True, t.backward))}
        size = len(network.states)
        matrix = self._generator({key: Fraction(1) for key in self.rates})
        matrix = [[*row, Fraction(0)] for row in matrix]
        matrix[-1] = [Fraction(1)] * (size + 1)
        self.p = eliminated(matrix)

    def _rate(self, rate: Expression | None) -> Fraction:
        if rate is None:
            return Fraction(0)
        value = sympy.nsimplify(sympy.simplify(plain(rate, self.at)))
        assert value.is_Rational and value > 0, value
        return Fraction(int(value.p), int(value.q))

    def _generator(self, factors: Mapping[tuple[int, bool], Fraction]) -> list[list[Fraction]]:
        size = len(self.network.states)
        matrix = [[Fraction(0)] * size for _ in range(size)]
        for (e, back), rate in self.rates.items():
            t = self.network.transitions[e]
            tail, head = (t.second, t.first) if back else (t.first, t.second)
            matrix[head][tail] += rate * factors[e, back]
            matrix[tail][tail] -= rate * factors[e, back]
        return matrix

    def value(self, node: Expression) -> sympy.Expr:
        """Return a quantity: a tree of atoms and symbols; responses of atoms by energies ..."""
        match node:
            case Sum(terms):
                return sympy.Add(*(self.value(term) for term in terms))
            case Product(factors):
                return sympy.Mul(*(self.value(factor) for factor in factors))
            case Power(base, exponent):
                below = sympy.Rational(exponent.numerator, exponent.denominator)
                return self.value(base) ** below
            case Function("ln", argument):
                return sympy.log(self.value(argument))
            case Function(_, argument):
                return sympy.exp(sympy.expand(self.value(argument)))
            case Response(inner, by):
                return self._response(inner, by)
            case Number() | Symbol():
                return plain(node, self.at)
            case EntropyProduction():
                return sympy.Add(*(
                    self.value(Current(e)) * sympy.log(sympy.Rational(*self._forces(e)))
                    for e in range(len(self.network.transitions))))
        return _rational(self._atom(node, self.p, {}))

    def _forces(self, e: int) -> tuple[int, int]:
        t = self.network.transitions[e]
        ratio = (self.rates[e, False] * self.p[t.first]) / (self.rates[e, True] * self.p[t.second])
        return ratio.numerator, ratio.denominator

    def _atom(self, node: Expression, p: list[Fraction],
              moves: Mapping[tuple[int, bool], Fraction]) -> Fraction:
        match node:
            case Probability(states):
                return sum((p[k] for k in states), Fraction(0))
            case Current(e):
                return self._flow(e, False, p, moves) - self._flow(e, True, p, moves)
            case Traffic(e):
                return self._flow(e, False, p, moves) + self._flow(e, True, p, moves)
            case DirectedRate(e, back):
                return self.rates[e, back]
            case Mean(place):
                values = [plain(v, self.at) for v in self.network.observables[place].values]
                return sum((Fraction(int(v.p), int(v.q)) * x
                            for v, x in zip(values, p, strict=True)), Fraction(0))
        raise TypeError(type(node).__name__)

    def _flow(self, e: int, back: bool, p: list[Fraction],
              moves: Mapping[tuple[int, bool], Fraction]) -> Fraction:
        t = self.network.transitions[e]
        tail = t.second if back else t.first
        rate = self.rates[e, back]
        return rate * (p[tail] + moves.get((e, back), Fraction(0)) * self.p[tail])

    def _response(self, inner: Expression, by: object) -> sympy.Expr:
        moves = {key: Fraction(0) for key in self.rates}
        for e, back in moves:
            t = self.network.transitions[e]
            match by:
                case BarrierOf(other) if other == e:
                    moves[e, back] = Fraction(-1)
                case DriveOf(other) if other == e:
                    moves[e, back] = Fraction(-1 if back else 1, 2)
                case EnergyOf(state) if state == (t.second if back else t.first):
                    moves[e, back] = Fraction(1)
        changed = self._generator(moves)
        right = [-sum((x * y for x, y in zip(row, self.p, strict=True)), Fraction(0))
                 for row in changed]
        matrix = [[*row, x] for row, x in
                  zip(self._generator({key: Fraction(1) for key in moves}), right, strict=True)]
        matrix[-1] = [Fraction(1)] * len(self.p) + [Fraction(0)]
        return _rational(self._atom(inner, eliminated(matrix), moves))


def _rational(value: Fraction) -> sympy.Expr:
    return sympy.Rational(value.numerator, value.denominator)
