"""Exact rational values at a point, without closed forms and for networks of any size.

Everything comes from the linear system W p = 0 itself: with eps_i the perturbations of a (nested)
response, the coefficients of p follow order by order from
W_0 p_S = - sum over non-empty T in S of W_T p_(S-T), and sum p_S = 0. No trees are used, so this
is also the second route to every closed form.
"""

from __future__ import annotations

from collections.abc import Mapping
from fractions import Fraction

import flint

from symbolic_response.errors import EvaluationError, UndecidedError
from symbolic_response.expressions.derivative import by_symbol, derivative
from symbolic_response.expressions.normal_form import normal_form
from symbolic_response.expressions.ring import Domain
from symbolic_response.expressions.signs import certain_sign
from symbolic_response.expressions.text import expression_text
from symbolic_response.expressions.tree import (
    Expression,
    Function,
    Number,
    Power,
    Product,
    Sum,
    Symbol,
    add,
    divide,
    function,
    multiply,
    number,
    rebuild,
    substitute,
)
from symbolic_response.network.model import Network, Transition
from symbolic_response.network.quantities import (
    BarrierOf,
    BarriersOf,
    BySymbol,
    Change,
    Current,
    DirectedRate,
    DriveOf,
    EnergyOf,
    EntropyProduction,
    Mean,
    Perturbation,
    Probability,
    Response,
    Traffic,
)
from symbolic_response.network.raised import with_barrier_raised
from symbolic_response.response.direct import direct_value
from symbolic_response.response.jets import (
    Jet,
    Scalar,
    constant_jet,
    jet_exponential,
    jet_logarithm,
    jet_power,
    jet_product,
    jet_sum,
    scaled_jet,
)
from symbolic_response.response.plain_signs import plain_sign

NO_SYMBOLS = Domain((), frozenset())


class _NotRationalError(Exception):
    """An atom has no rational value."""


def atomic(quantity: Expression, network: Network) -> Expression:
    """Return a quantity with responses of atoms only, entropy production as a sum of atoms."""

    def leaf(part: Expression) -> Expression:
        if isinstance(part, Response):
            by = part.perturbation
            return derivative(atomic(part.quantity, network), lambda atom: _changed(atom, by))
        return _entropy_production(network) if isinstance(part, EntropyProduction) else part

    return rebuild(quantity, leaf)


def _changed(atom: Expression, by: Perturbation) -> Expression:
    if not isinstance(atom, Symbol):
        return Response(atom, by)
    if not isinstance(by, BySymbol) or by.name != atom.name:
        return number(0)
    return atom if by.logarithmic else number(1)


def _entropy_production(network: Network) -> Expression:
    """Return the sum of J ln(w+/w-): the ln(p_m/p_n) add up to nothing."""
    terms = []
    for e in range(len(network.transitions)):
        ratio = divide(DirectedRate(e, False), DirectedRate(e, True))
        terms.append(multiply([Current(e), function("ln", ratio)]))
    return add(terms)


class Point:
    """A network at given values of all its symbols.

    ``values``: a constant expression (``3/7``, ``ln(3/2)``) for every symbol of the network.
    Raises EvaluationError, naming the rate and the point, if a rate is not positive there.
    """

    def __init__(self, network: Network, values: Mapping[str, Expression]) -> None:
        self.network = network
        self.values = dict(values)
        self._probabilities: dict[tuple[Perturbation, ...], list[Jet] | None] = {}
        self._constants: dict[tuple[Expression, tuple[BySymbol, ...]], Scalar] = {}
        self._raised: dict[tuple[int, Expression], Point] = {}
        self._inverse: flint.fmpq_mat | None = None
        self._check_rates()

    def value(self, quantity: Expression) -> Fraction | None:
        """Return the exact value of a quantity, None where it is not known to be rational."""
        found = self._jet(quantity, ())[0]
        return None if found is None else Fraction(int(found.p), int(found.q))

    def expression(self, quantity: Expression) -> Expression | None:
        """Return the exact value of a quantity as a constant expression.

        Every atom, and every response of an atom, becomes a rational number; None where one of
        them is not known to be rational.
        """
        try:
            return rebuild(atomic(quantity, self.network), self._constant_leaf)
        except _NotRationalError:
            return None

    def _constant_leaf(self, leaf: Expression) -> Expression:
        if isinstance(leaf, Symbol):
            return self.values[leaf.name]
        if isinstance(leaf, Number):
            return leaf
        if isinstance(leaf, Change):
            both = self.raised(leaf).expression(leaf.quantity), self.expression(leaf.quantity)
            if both[0] is None or both[1] is None:
                raise _NotRationalError
            return add([both[0], multiply([number(-1), both[1]])])
        exact = self.value(leaf)
        if exact is None:
            raise _NotRationalError
        return number(exact)

    def raised(self, change: Change) -> Point:
        """Return the network after the change, at the same values."""
        key = (change.transition, change.amount)
        if key not in self._raised:
            network = with_barrier_raised(self.network, *key)
            self._raised[key] = Point(network, self.values)
        return self._raised[key]

    def rate(self, transition: int, backward: bool) -> Fraction:
        """Return a directed rate; EvaluationError where it is not rational."""
        (found,) = self._rate(transition, backward, ())
        if found is None:
            name = self.network.transitions[transition].name
            raise EvaluationError(f"a rate of transition {name!r} is not rational at this point")
        return Fraction(int(found.p), int(found.q))

    def _check_rates(self) -> None:
        for transition in self.network.transitions:
            for rate in (transition.forward, transition.backward):
                if rate is None:
                    continue
                value = direct_value(rate, self.values)
                if value is not None:
                    self._constants[(rate, ())] = value
                positive = value > 0 if value is not None else self._is_positive(rate, transition)
                if not positive:
                    raise EvaluationError(
                        f"rate {expression_text(rate)!r} of transition {transition.name!r} is not"
                        f" positive at {self._shown()}"
                    )

    def _is_positive(self, rate: Expression, transition: Transition) -> bool:
        placed = substitute(rate, self.values)
        if plain_sign(placed, frozenset()) == 1:
            return True
        sign = certain_sign(placed, frozenset())
        if sign is None:
            raise UndecidedError(
                f"the sign of rate {expression_text(rate)!r} of transition {transition.name!r} was"
                f" not settled at {self._shown()}"
            )
        return sign == 1

    def _shown(self) -> str:
        return ", ".join(f"{k} = {expression_text(v)}" for k, v in self.values.items())

    # -- expressions of symbols ------------------------------------------------------------

    def _symbolic(self, node: Expression, stack: tuple[Perturbation, ...]) -> Jet:
        """Return the jet of an expression in symbols: its mixed derivatives, exactly."""
        coefficients: list[Scalar] = []
        for mask in range(2 ** len(stack)):
            chosen = [p for place, p in enumerate(stack) if mask >> place & 1]
            steps = tuple(p for p in chosen if isinstance(p, BySymbol))
            if len(steps) < len(chosen):
                coefficients.append(flint.fmpq(0))
            else:
                coefficients.append(self._constant(node, steps))
        return tuple(coefficients)

    def _constant(self, node: Expression, steps: tuple[BySymbol, ...]) -> Scalar:
        key = (node, steps)
        if key not in self._constants:
            changed = node
            for step in reversed(steps):
                changed = by_symbol(changed, step.name)
                if step.logarithmic:
                    changed = multiply([Symbol(step.name), changed])
            found = direct_value(changed, self.values)
            if found is None:
                found = rational_constant(substitute(changed, self.values))
            self._constants[key] = found
        return self._constants[key]

    def _rate(self, e: int, backward: bool, stack: tuple[Perturbation, ...]) -> Jet:
        transition = self.network.transitions[e]
        rate = transition.backward if backward else transition.forward
        if rate is None:
            return constant_jet(flint.fmpq(0), len(stack))
        jet = self._symbolic(rate, stack)
        source = transition.second if backward else transition.first
        for place, perturbation in enumerate(stack):
            weight = elementary_weight(perturbation, e, backward, source)
            if weight:
                factor = list(constant_jet(flint.fmpq(1), len(stack)))
                factor[1 << place] = flint.fmpq(weight.numerator, weight.denominator)
                jet = jet_product(jet, tuple(factor))
        return jet

    # -- the steady state ------------------------------------------------------------------

    def probabilities(self, stack: tuple[Perturbation, ...]) -> list[Jet] | None:
        """Return the jets of all probabilities, None where a rate is not rational."""
        if stack not in self._probabilities:
            self._probabilities[stack] = self._solve(stack)
        return self._probabilities[stack]

    def _solve(self, stack: tuple[Perturbation, ...]) -> list[Jet] | None:
        size, masks = len(self.network.states), 2 ** len(stack)
        generators = [flint.fmpq_mat(size, size) for _ in range(masks)]
        for e, transition in enumerate(self.network.transitions):
            for backward in (False, True):
                ends = (transition.first, transition.second)
                source, target = ends[::-1] if backward else ends
                for mask, rate in enumerate(self._rate(e, backward, stack)):
                    if rate is None:
                        return None
                    generators[mask][target, source] += rate
                    generators[mask][source, source] -= rate
        solver = self._solver(generators[0], size)
        unit = flint.fmpq_mat(size, 1)
        unit[size - 1, 0] = 1
        solutions = [solver * unit]
        for mask in range(1, masks):
            right = flint.fmpq_mat(size, 1)
            part = mask
            while part:
                right -= generators[part] * solutions[mask ^ part]
                part = (part - 1) & mask
            right[size - 1, 0] = 0
            solutions.append(solver * right)
        return [tuple(solution[k, 0] for solution in solutions) for k in range(size)]

    def _solver(self, generator: flint.fmpq_mat, size: int) -> flint.fmpq_mat:
        if self._inverse is None:
            system = flint.fmpq_mat(generator)
            for column in range(size):
                system[size - 1, column] = 1
            self._inverse = system.inv()
        return self._inverse

    # -- quantities ------------------------------------------------------------------------

    def _jet(self, node: Expression, stack: tuple[Perturbation, ...]) -> Jet:
        match node:
            case Number() | Symbol():
                return self._symbolic(node, stack)
            case Sum(terms):
                return jet_sum([self._jet(term, stack) for term in terms])
            case Product(factors):
                result = self._jet(factors[0], stack)
                for factor in factors[1:]:
                    result = jet_product(result, self._jet(factor, stack))
                return result
            case Power(base, exponent):
                inner = self._jet(base, stack)
                if exponent > 0 and not stack and inner[0] is not None and inner[0] == 0:
                    return inner
                return jet_power(inner, exponent)
            case Function("exp", argument):
                return jet_exponential(self._jet(argument, stack))
            case Function(_, argument):
                return jet_logarithm(self._jet(argument, stack))
            case Response(inner, perturbation):
                changed = self._jet(inner, (*stack, perturbation))
                return changed[len(changed) // 2 :]
            case Change(inner) if not stack:
                before = scaled_jet(self._jet(inner, ()), flint.fmpq(-1))
                return jet_sum([self.raised(node)._jet(inner, ()), before])
        return self._atom(node, stack)

    def _atom(self, node: Expression, stack: tuple[Perturbation, ...]) -> Jet:
        if isinstance(node, DirectedRate):
            return self._rate(node.transition, node.backward, stack)
        solved = self.probabilities(stack)
        if solved is None:
            return (None,) * (1 << len(stack))
        match node:
            case Probability(states):
                return jet_sum([solved[k] for k in states])
            case Mean(place):
                values = self.network.observables[place].values
                return jet_sum([
                    jet_product(self._symbolic(value, stack), p)
                    for value, p in zip(values, solved, strict=True)
                ])
            case Current(e):
                return self._flow(e, -1, solved, stack)
            case Traffic(e):
                return self._flow(e, 1, solved, stack)
            case EntropyProduction():
                return jet_sum([
                    jet_product(self._flow(e, -1, solved, stack), self._edge_force(e, stack))
                    for e in range(len(self.network.transitions))
                ])
        raise TypeError(f"no value for {type(node).__name__}")

    def _flow(self, e: int, sign: int, solved: list[Jet], stack: tuple[Perturbation, ...]) -> Jet:
        transition = self.network.transitions[e]
        forward = jet_product(self._rate(e, False, stack), solved[transition.first])
        backward = jet_product(self._rate(e, True, stack), solved[transition.second])
        return jet_sum([forward, scaled_jet(backward, flint.fmpq(sign))])

    def _edge_force(self, e: int, stack: tuple[Perturbation, ...]) -> Jet:
        """Return ln(w+/w-): in the sum over transitions the ln(p_m/p_n) add up to nothing."""
        ratio = jet_product(
            self._rate(e, False, stack), jet_power(self._rate(e, True, stack), Fraction(-1))
        )
        return jet_logarithm(ratio)


def rational_constant(node: Expression) -> Scalar:
    """Return a constant expression as a rational number, None if it is not known to be one."""
    exact = node.value if isinstance(node, Number) else normal_form(node, NO_SYMBOLS).as_fraction()
    return None if exact is None else flint.fmpq(exact.numerator, exact.denominator)


def elementary_weight(
    perturbation: Perturbation, e: int, backward: bool, source: int
) -> Fraction | None:
    """Return the derivative of ln of a directed rate by an elementary perturbation."""
    match perturbation:
        case EnergyOf(state) if state == source:
            return Fraction(1)
        case BarrierOf(transition) if transition == e:
            return Fraction(-1)
        case BarriersOf(transitions) if e in transitions:
            return Fraction(-1)
        case DriveOf(transition) if transition == e:
            return Fraction(-1, 2) if backward else Fraction(1, 2)
    return None
