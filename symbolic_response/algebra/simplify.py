"""From expression trees to factored form."""

from __future__ import annotations

from collections.abc import Callable
from fractions import Fraction

from symbolic_response.algebra.factored import (
    ZERO,
    Context,
    Factored,
    FactoredFunction,
    FactoredSum,
    constant,
    from_polynomial,
    integer_power,
    monomial_of,
    product,
    scaled,
)
from symbolic_response.algebra.sums import total
from symbolic_response.algebra.vanishing import vanishes
from symbolic_response.errors import EvaluationError, UndecidedError
from symbolic_response.expressions.enclosure import nonzero_somewhere
from symbolic_response.expressions.normal_form import exponential, normal_form, rational_power
from symbolic_response.expressions.ring import Polynomial, symbol_ring
from symbolic_response.expressions.tree import (
    Expression,
    Function,
    Number,
    Power,
    Product,
    Sum,
    Symbol,
    add,
    number,
)

MAX_FUNCTION_TERMS = 60


def simplify(
    node: Expression, context: Context, leaf: Callable[[Polynomial], Factored]
) -> Factored:
    """Return a tree in factored form; ``leaf`` gives the form of each polynomial leaf.

    Raises EvaluationError for a division by what is identically zero.
    """
    match node:
        case Number(value):
            return constant(value)
        case Symbol(name):
            ring = symbol_ring(name, context.domain)
            return monomial_of(ring.generators[0], Fraction(1))
        case Polynomial():
            return leaf(node)
        case Sum(terms):
            result = total([simplify(term, context, leaf) for term in terms], context)
            return ZERO if _vanishing_functions(result, context) else result
        case Product(factors):
            return product([simplify(factor, context, leaf) for factor in factors])
        case Power(base, exponent):
            return raised(simplify(base, context, leaf), exponent, context)
        case Function("exp", argument):
            return exponential_of(simplify(argument, context, leaf), context)
        case Function(_, argument):
            return logarithm_of(simplify(argument, context, leaf), context)
    raise TypeError(f"cannot simplify {type(node).__name__}")


def raised(value: Factored, exponent: Fraction, context: Context) -> Factored:
    """Return a rational power; EvaluationError for zero to a negative one."""
    if exponent < 0:
        require_nonzero(value, context)
    if value.is_zero():
        return ZERO
    if exponent.denominator == 1:
        return integer_power(value, exponent.numerator)
    if not _certainly_positive(value):
        if value.is_constant() and value.coefficient < 0:
            raise EvaluationError("a root of a negative number")
        return Factored(Fraction(1), factors=((FactoredSum((value,)), exponent),))
    parts = [_root_of_number(value.coefficient, exponent, context)]
    parts += [
        monomial_of(generator, power * exponent)
        for generator, power in value.ring.powers(value.monomial)
    ]
    bases = tuple((base, power * exponent) for base, power in value.factors)
    return product([*parts, Factored(Fraction(1), factors=bases)])


def _root_of_number(value: Fraction, exponent: Fraction, context: Context) -> Factored:
    form = rational_power(normal_form(Number(value), context.domain), exponent, context.domain)
    top = from_polynomial(form.numerator, form.ring, context)
    return product([top, integer_power(from_polynomial(form.denominator, form.ring, context), -1)])


def _certainly_positive(value: Factored) -> bool:
    """Return whether every part is positive for all admissible values."""
    if value.coefficient <= 0:
        return False
    if not all(generator.positive for generator, _ in value.ring.powers(value.monomial)):
        return False
    return all(
        isinstance(base, Polynomial)
        and all(generator.positive for generator in base.ring.generators)
        and all(coefficient > 0 for coefficient in base.poly.coeffs())
        for base, _ in value.factors
    )


def exponential_of(value: Factored, context: Context) -> Factored:
    """Return exp of a factored form: a monomial where the argument is short enough."""
    if value.is_zero():
        return constant(1)
    if value.literals() > MAX_FUNCTION_TERMS or not _is_plain(value):
        return _function("exp", value)
    form = exponential(normal_form(value.expression(), context.domain), context.domain)
    top = from_polynomial(form.numerator, form.ring, context)
    return product([top, integer_power(from_polynomial(form.denominator, form.ring, context), -1)])


def _is_plain(value: Factored) -> bool:
    return all(
        exponent > 0
        and (
            isinstance(base, Polynomial)
            or (isinstance(base, FactoredSum) and all(_is_plain(term) for term in base.terms))
            or (isinstance(base, FactoredFunction) and _is_plain(base.argument))
        )
        for base, exponent in value.factors
    )


def logarithm_of(value: Factored, context: Context) -> Factored:
    """Return ln of a factored form, the exponentials in it taken out of the logarithm."""
    require_nonzero(value, context)
    if value.is_constant() and value.coefficient < 0:
        raise EvaluationError("a logarithm of a negative number")
    terms = []
    kept = list(value.monomial)
    for place, generator in enumerate(value.ring.generators):
        if generator.kind == "exp":
            exponent = Fraction(value.monomial[place], value.ring.roots[place])
            argument = simplify(generator.base, context, _no_leaf)
            terms.append(scaled(argument, exponent))
            kept[place] = 0
    rest = product([Factored(value.coefficient, value.ring, tuple(kept), value.factors)])
    if not _is_one(rest, context):
        terms.append(_function("ln", rest))
    return total(terms, context)


def _vanishing_functions(value: Factored, context: Context) -> bool:
    """Return whether a short sum with functions, such as ln(a*b) - ln(a) - ln(b), is zero."""
    sums = [base for base, _ in value.factors if isinstance(base, FactoredSum)]
    if not sums or value.literals() > MAX_FUNCTION_TERMS:
        return False
    return vanishes(value.expression(), context.domain)


def _is_one(value: Factored, context: Context) -> bool:
    if value == constant(1):
        return True
    difference = add([value.expression(), number(-1)])
    return vanishes(difference, context.domain)


def _no_leaf(leaf: Polynomial) -> Factored:
    raise TypeError("a polynomial where only symbols occur")


def _function(name: str, argument: Factored) -> Factored:
    return Factored(Fraction(1), factors=((FactoredFunction(name, argument), Fraction(1)),))


def require_nonzero(value: Factored, context: Context) -> None:
    """Raise EvaluationError if a factored form vanishes identically.

    Products vanish only where one of their unexpanded sums does: a point where its enclosure
    excludes zero settles that; failing this, its normal form. UndecidedError if neither does.
    """
    if value.is_zero():
        raise EvaluationError("division by, or logarithm of, an expression that is identically 0")
    for base, _ in value.factors:
        node = Factored(Fraction(1), factors=((base, Fraction(1)),)).expression()
        if isinstance(base, FactoredSum) and not nonzero_somewhere(node):
            if vanishes(node, context.domain):
                raise EvaluationError(
                    "division by, or logarithm of, an expression that is identically 0"
                )
            raise UndecidedError("whether a divisor vanishes identically was not settled")
