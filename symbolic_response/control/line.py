"""A network in which one symbol varies: its steady state as functions of that symbol.

Everything comes from the linear system W(y) p = 0 with polynomial entries, by fraction-free
elimination (Bareiss 1968); no trees and no closed forms in all symbols. Responses follow order by
order: W p_S = - sum over non-empty T in S of W_T p_(S-T), sum p_S = 0.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from fractions import Fraction
from functools import cached_property
from math import lcm

import flint

from symbolic_response.control.rational import (
    EXPONENTIAL,
    PLAIN,
    POWER,
    Poly,
    RationalFunction,
    rational_function,
    real_roots,
)
from symbolic_response.errors import AssignmentError, EvaluationError
from symbolic_response.expressions.derivative import by_symbol
from symbolic_response.expressions.normal_form import normal_form
from symbolic_response.expressions.ring import Domain, Generator, all_symbols
from symbolic_response.expressions.text import expression_text
from symbolic_response.expressions.tree import (
    Expression,
    Function,
    Number,
    Power,
    Product,
    Sum,
    Symbol,
    children,
    multiply,
    number,
    substitute,
    symbols_of,
    walk,
)
from symbolic_response.network.model import Network
from symbolic_response.network.quantities import (
    BySymbol,
    Change,
    Current,
    DirectedRate,
    Mean,
    Perturbation,
    Probability,
    Response,
    Traffic,
)
from symbolic_response.network.raised import with_barrier_raised
from symbolic_response.response.deriving import Given, check_values, given
from symbolic_response.response.values import atomic, elementary_weight

Stack = tuple[Perturbation, ...]
Jet = list[RationalFunction]
"""The mixed derivatives by a stack of perturbations, the one by the set S at the index S."""


class Line:
    """A network of which one symbol varies and all others have exact values.

    Serves several quantities; the system is solved once for each stack of perturbations.
    """

    def __init__(self, network: Network, symbol: str, values: Mapping[str, Given]) -> None:
        network.symbol(symbol)
        self.network = network
        self.symbol = symbol
        self.values = given(values)
        check_values(self.values, network)
        if symbol in self.values:
            raise AssignmentError(f"{symbol} varies; leave its value out")
        self._converted: dict[Expression, RationalFunction] = {}
        self._solved: dict[Stack, list[Jet]] = {}
        self._check_rates()

    @cached_property
    def kind(self) -> str:
        """What the variable of the functions stands for; see ``rational``."""
        if self.network.symbol(self.symbol).positive:
            return POWER
        parts = [rate for t in self.network.transitions for rate in (t.forward, t.backward)
                 if rate is not None]
        parts += [value for entry in self.network.observables for value in entry.values]
        inside = any(
            isinstance(part, Function) and part.name == "exp" and self.symbol in symbols_of(part)
            for whole in parts for part in walk(whole)
        )
        return EXPONENTIAL if inside else PLAIN

    def constant(self, value: int | Fraction) -> RationalFunction:
        """Return a number as a function of the symbol."""
        exact = Fraction(value)
        return rational_function(self.symbol, self.kind, 1, Poly([exact.numerator]),
                                 Poly([exact.denominator]))

    def function(self, quantity: Expression) -> RationalFunction:
        """Return a quantity as a function of the symbol; errors as for :func:`function_of`."""
        return self._value(atomic(quantity, self.network))

    def _value(self, node: Expression) -> RationalFunction:
        if all(isinstance(part, Symbol | Number) or children(part) for part in walk(node)):
            return self.converted(node)
        match node:
            case Sum(terms):
                return sum((self._value(term) for term in terms), self.constant(0))
            case Product(factors):
                result = self.constant(1)
                for factor in factors:
                    result = result * self._value(factor)
                return result
            case Power(base, exponent) if exponent.denominator == 1:
                return self._value(base) ** exponent.numerator
            case Power() | Function():
                what = "a root" if isinstance(node, Power) else f"{node.name}(...)"
                raise EvaluationError(f"{what} of a quantity is not a rational function of"
                                      f" {self.symbol}; ask for what it is taken of")
            case Change(inner, e, amount):
                raised = with_barrier_raised(self.network, e, amount)
                after = Line(raised, self.symbol, self.values)
                return after.function(inner) - self.function(inner)
            case Response():
                return self._atom(*_outermost_first(node))[-1]
        return self._atom(node, ())[-1]

    # -- expressions of symbols ------------------------------------------------------------

    def converted(self, node: Expression) -> RationalFunction:
        """Return an expression of symbols as a function of the one that varies."""
        if node not in self._converted:
            self._converted[node] = self._convert(node)
        return self._converted[node]

    def _convert(self, node: Expression) -> RationalFunction:
        placed = substitute(node, self.values)
        missing = sorted(symbols_of(placed) - {self.symbol})
        if missing:
            raise EvaluationError(f"{missing[0]} has no value; give one, such as {missing[0]}=3/2")
        positive = self.network.positive_symbols & {self.symbol}
        form = normal_form(placed, Domain((self.symbol,), positive))
        place, used = None, zip(form.numerator.degrees(), form.denominator.degrees(), strict=True)
        for index, degrees in enumerate(used):
            if any(degrees):
                if not self._is_variable(form.ring.generators[index]):
                    raise self._irrational(node, form.ring.generators[index])
                place = index
        root = 1 if place is None else form.ring.roots[place]
        polys = []
        for poly in (form.numerator, form.denominator):
            coefficients: list[flint.fmpz] = [flint.fmpz(0)] * (poly.total_degree() + 1)
            for exponents, coefficient in poly.terms():
                coefficients[0 if place is None else int(exponents[place])] = coefficient
            polys.append(Poly(coefficients))
        return rational_function(self.symbol, self.kind, root, *polys)

    def _is_variable(self, generator: Generator) -> bool:
        if generator.base != Symbol(self.symbol):
            return False
        return generator.kind == ("exp" if self.kind == EXPONENTIAL else "symbol")

    def _irrational(self, node: Expression, generator: Generator) -> EvaluationError:
        """Return the error that names the symbol whose value, or use, is to blame."""
        if self.symbol in all_symbols(generator.base):
            use = {POWER: "powers", EXPONENTIAL: "exponents with numbers in front, and only there",
                   PLAIN: "sums, products and integer powers"}[self.kind]
            return EvaluationError(f"'{expression_text(node)}' is not rational in {self.symbol}:"
                                   f" {self.symbol} must occur in {use}")
        name = self._to_blame(node)
        if not self.network.symbol(name).positive:
            write = f"{name}=2*ln(3/2)"
        else:
            write = f"{name}=9/4, a power of a fraction"
        return EvaluationError(
            f"{name} = {expression_text(self.values[name])} makes '{expression_text(node)}'"
            f" irrational; write a value such as {write}")

    def _to_blame(self, node: Expression) -> str:
        names = sorted(symbols_of(node) & self.values.keys())
        domain = Domain(tuple(sorted(symbols_of(node))), self.network.positive_symbols)
        for name in names:
            form = normal_form(substitute(node, {name: self.values[name]}), domain)
            if any(not all_symbols(generator.base) for generator in form.ring.generators):
                return name
        return names[0]

    def _check_rates(self) -> None:
        """Raise EvaluationError if a rate is not positive at every value of the symbol."""
        for transition in self.network.transitions:
            for rate in (transition.forward, transition.backward):
                if rate is not None and not _is_positive(self.converted(rate)):
                    raise EvaluationError(
                        f"rate {expression_text(rate)!r} of transition {transition.name!r} is not"
                        f" positive at every {self.symbol}; substitute a {self.symbol} that keeps"
                        " it positive")

    def _symbolic(self, node: Expression, stack: Stack) -> Jet:
        """Return the mixed derivatives of an expression of symbols."""
        found = []
        for mask in range(1 << len(stack)):
            chosen = [p for place, p in enumerate(stack) if mask >> place & 1]
            steps = [p for p in chosen if isinstance(p, BySymbol)]
            changed = node
            for step in reversed(steps):
                changed = by_symbol(changed, step.name)
                if step.logarithmic:
                    changed = multiply([Symbol(step.name), changed])
            whole = len(steps) == len(chosen)
            found.append(self.converted(changed) if whole else self.constant(0))
        return found

    def _rate(self, e: int, backward: bool, stack: Stack) -> Jet:
        transition = self.network.transitions[e]
        rate = transition.backward if backward else transition.forward
        if rate is None:
            return [self.constant(0)] * (1 << len(stack))
        jet = self._symbolic(rate, stack)
        source = transition.second if backward else transition.first
        for place, by in enumerate(stack):
            weight = elementary_weight(by, e, backward, source)
            if weight:
                jet = [jet[m ^ 1 << place] * weight if m >> place & 1 else jet[m]
                       for m in range(len(jet))]
        return jet

    # -- the steady state ------------------------------------------------------------------

    def probabilities(self, stack: Stack) -> list[Jet]:
        """Return the mixed derivatives of all probabilities."""
        if stack not in self._solved:
            rates = [(t.first, t.second, self._rate(e, False, stack))
                     for e, t in enumerate(self.network.transitions)]
            rates += [(t.second, t.first, self._rate(e, True, stack))
                      for e, t in enumerate(self.network.transitions)]
            found = [self._steady]
            for mask in range(1, 1 << len(stack)):
                found.append(self._changed(mask, rates, found))
            self._solved[stack] = [[p[k] for p in found] for k in range(len(self._steady))]
        return self._solved[stack]

    def _changed(
        self, mask: int, rates: Sequence[tuple[int, int, Jet]], found: list[Jet]
    ) -> Jet:
        """Return p_S from those of the smaller sets."""
        right = [self.constant(0)] * len(found[0])
        part = mask
        while part:
            for tail, head, jet in rates:
                if not jet[part].is_zero():
                    flow = jet[part] * found[mask ^ part][tail]
                    right[head], right[tail] = right[head] - flow, right[tail] + flow
            part = (part - 1) & mask
        right[-1] = self.constant(0)
        root, scale, inverse, determinant = self._inverse
        common = _common_denominator(right, root := lcm(root, *(r.root for r in right)))
        tops = [top * (common // bottom) for top, bottom in (r.over(root) for r in right)]
        step = root // self._inverse[0]
        below = determinant.inflate(step) * common
        return [rational_function(
            self.symbol, self.kind, root,
            sum((entry.inflate(step) * top for entry, top in zip(row, tops, strict=True)), Poly(0))
            * scale.inflate(step), below) for row in inverse]

    @cached_property
    def _system(self) -> tuple[int, Poly, list[list[Poly]]]:
        """(root, L, A): L times the generator in that root, its last row replaced by ones."""
        size = len(self.network.states)
        rates = [(ends, self._rate(e, backward, ())[0])
                 for e, t in enumerate(self.network.transitions)
                 for backward, ends in ((False, (t.first, t.second)), (True, (t.second, t.first)))]
        root = lcm(*(rate.root for _, rate in rates))
        scale = _common_denominator([rate for _, rate in rates], root)
        matrix = [[Poly(0) for _ in range(size)] for _ in range(size)]
        for (tail, head), rate in rates:
            top, bottom = rate.over(root)
            flow = top * (scale // bottom)
            matrix[head][tail] += flow
            matrix[tail][tail] -= flow
        matrix[-1] = [Poly(1)] * size
        return root, scale, matrix

    @cached_property
    def _steady(self) -> Jet:
        root, _, matrix = self._system
        size = len(matrix)
        solution, determinant = solved(matrix, [[Poly(int(k == size - 1))] for k in range(size)])
        return [rational_function(self.symbol, self.kind, root, row[0], determinant)
                for row in solution]

    @cached_property
    def _inverse(self) -> tuple[int, Poly, list[list[Poly]], Poly]:
        root, scale, matrix = self._system
        size = range(len(matrix))
        return root, scale, *solved(matrix, [[Poly(int(i == j)) for j in size] for i in size])

    # -- atoms -----------------------------------------------------------------------------

    def _atom(self, node: Expression, stack: Stack) -> Jet:
        match node:
            case DirectedRate(e, backward):
                return self._rate(e, backward, stack)
            case Probability(states):
                return _total([self.probabilities(stack)[k] for k in states])
            case Mean(place):
                values = self.network.observables[place].values
                return _total([
                    _product(self._symbolic(value, stack), p)
                    for value, p in zip(values, self.probabilities(stack), strict=True)
                    if value != number(0)] or [self._symbolic(number(0), stack)])
            case Current(e) | Traffic(e):
                t, solution = self.network.transitions[e], self.probabilities(stack)
                ahead = _product(self._rate(e, False, stack), solution[t.first])
                back = _product(self._rate(e, True, stack), solution[t.second])
                sign = -1 if isinstance(node, Current) else 1
                return [a + b * sign for a, b in zip(ahead, back, strict=True)]
        raise TypeError(f"no function for {type(node).__name__}")


def _outermost_first(node: Expression) -> tuple[Expression, Stack]:
    """Return the atom of a nested response and its perturbations."""
    stack: Stack = ()
    while isinstance(node, Response):
        stack, node = (*stack, node.perturbation), node.quantity
    return node, stack


def _total(jets: Sequence[Jet]) -> Jet:
    return [sum(parts[1:], parts[0]) for parts in zip(*jets, strict=True)]


def _product(a: Jet, b: Jet) -> Jet:
    """Return the product rule: the entry of S sums a_T b_(S-T) over T in S."""
    found = []
    for whole in range(len(a)):
        parts = [part for part in range(whole + 1) if part & whole == part]
        found.append(sum((a[part] * b[whole ^ part] for part in parts[1:]), a[0] * b[whole]))
    return found


def _common_denominator(functions: Sequence[RationalFunction], root: int) -> Poly:
    common = Poly(1)
    for f in functions:
        bottom = f.over(root)[1]
        common = common * (bottom // common.gcd(bottom))
    return common


def solved(matrix: list[list[Poly]], right: list[list[Poly]]) -> tuple[list[list[Poly]], Poly]:
    """Return X and d with ``matrix X = d right``, d the determinant up to sign and not zero.

    Fraction-free Gauss-Jordan elimination: after each step every entry is a minor of the matrix
    with its right sides, so that the division by the last pivot is exact (Bareiss 1968).
    """
    rows = [[*left, *more] for left, more in zip(matrix, right, strict=True)]
    size, previous = len(rows), Poly(1)
    for step in range(size):
        pivot = next(i for i in range(step, size) if not rows[i][step].is_zero())
        rows[step], rows[pivot] = rows[pivot], rows[step]
        own, lead = rows[step], rows[step][step]
        for i in range(size):
            factor = rows[i][step]
            if i != step:
                rows[i] = [(lead * entry - factor * other) // previous
                           for entry, other in zip(rows[i], own, strict=True)]
        previous = lead
    return [row[size:] for row in rows], previous


def _is_positive(rate: RationalFunction) -> bool:
    """Return whether a function is positive at all values of its symbol."""
    polys = (rate.numerator, rate.denominator)
    if rate.kind != PLAIN and all(c >= 0 for poly in polys for c in poly.coeffs()):
        return not rate.is_zero()
    if rate.is_zero() or any(
        rate.kind == PLAIN or root > 0 for poly in polys for root in real_roots(poly)
    ):
        return False
    return rate.at_place(Fraction(1)) > 0
