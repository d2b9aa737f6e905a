"""Rigorous enclosures of constant expressions by ball arithmetic."""

from __future__ import annotations

from collections.abc import Mapping
from fractions import Fraction

import flint

from symbolic_response.errors import EvaluationError, UndecidedError
from symbolic_response.expressions.ring import Polynomial, all_symbols
from symbolic_response.expressions.tree import (
    Expression,
    Function,
    Number,
    Power,
    Product,
    Sum,
    Symbol,
    walk,
)

MAX_PRECISION = 4096
RELATIVE_WIDTH = Fraction(1, 10**20)
_ACCURACY_BITS = 72  # a little more than RELATIVE_WIDTH asks for
_SHOWN_DIGITS = 25
_PRECISIONS = (128, 256, 512, 1024, 2048, MAX_PRECISION)


def ball(node: Expression, values: Mapping[str, flint.arb] | None = None) -> flint.arb:
    """Return a ball that contains the value, at the precision in force (``flint.ctx``)."""
    match node:
        case Number(value):
            return flint.arb(flint.fmpq(value.numerator, value.denominator))
        case Symbol(name):
            return (values or {})[name]
        case Sum(terms):
            return sum((ball(term, values) for term in terms), flint.arb(0))
        case Product(factors):
            result = flint.arb(1)
            for factor in factors:
                result *= ball(factor, values)
            return result
        case Power(base, exponent):
            return _ball_power(ball(base, values), exponent)
        case Polynomial():
            return _ball_polynomial(node, values)
        case Function("exp", argument):
            return ball(argument, values).exp()
        case Function(_, argument):
            return ball(argument, values).log()
    raise TypeError(f"no enclosure for {type(node).__name__}")


def _ball_polynomial(leaf: Polynomial, values: Mapping[str, flint.arb] | None) -> flint.arb:
    variables = [
        ball(generator.expression(Fraction(1, root)), values)
        for generator, root in zip(leaf.ring.generators, leaf.ring.roots, strict=True)
    ]
    total = flint.arb(0)
    for exponents, coefficient in leaf.poly.terms():
        term = flint.arb(coefficient)
        for variable, exponent in zip(variables, exponents, strict=True):
            if exponent:
                term *= variable ** int(exponent)
        total += term
    return total


def _ball_power(base: flint.arb, exponent: Fraction) -> flint.arb:
    if exponent.denominator != 1 and base != 0:
        base = base.root(exponent.denominator)  # no number where the base may be negative
    raised = base ** abs(exponent.numerator)
    return 1 / raised if exponent < 0 else raised


def sign_of_constant(node: Expression) -> int:
    """Return the sign, +1 or -1, of a constant that is not known to be zero.

    Raises UndecidedError where 4096 bits cannot tell it from zero, or it has no value.
    """
    for precision in _PRECISIONS:
        with flint.ctx.workprec(precision):
            value = ball(node)
            if value > 0:
                return 1
            if value < 0:
                return -1
    raise UndecidedError(f"a value cannot be told from zero at {MAX_PRECISION} bits")


def decimal_enclosure(node: Expression) -> tuple[str, str]:
    """Return two decimals, as text, that enclose a constant; relative width at most 1e-20.

    Rounded outwards exactly. Raises UndecidedError where 4096 bits cannot tell the value, or what
    must not be zero on the way to it, from zero; EvaluationError where it has none (a logarithm or
    root of a negative number).
    """
    for precision in _PRECISIONS:
        with flint.ctx.workprec(precision):
            value = ball(node)
            if value.is_finite() and (value > 0 or value < 0):
                shown = _round_outwards(value)
                if shown is not None:
                    return shown
    if value.is_nan():
        _refuse_without_value(node)
    elif not value.is_finite():
        raise EvaluationError("the value is too large to enclose")
    raise UndecidedError(f"a value cannot be told from zero at {MAX_PRECISION} bits")


def _refuse_without_value(node: Expression) -> None:
    """Raise EvaluationError if some part of a constant certainly has no value."""
    with flint.ctx.workprec(MAX_PRECISION):
        for part in walk(node):
            if isinstance(part, Function) and part.name == "ln" and ball(part.argument) <= 0:
                raise EvaluationError("a logarithm of zero or of a negative number")
            if isinstance(part, Power):
                base = ball(part.base)
                if base < 0 and part.exponent.denominator != 1:
                    raise EvaluationError("a root of a negative number")
                if base == 0 and part.exponent < 0:
                    raise EvaluationError("division by zero")
                if not (base.is_finite() or base.is_nan()):
                    raise EvaluationError("a part of the value is too large to enclose")


def _round_outwards(value: flint.arb) -> tuple[str, str] | None:
    if value.rel_accuracy_bits() < _ACCURACY_BITS:
        return None
    size = abs(value).log() / flint.arb(10).log()
    digits = _SHOWN_DIGITS - _integer(size.mid().floor())
    power = flint.arb(10) ** flint.fmpz(abs(digits))
    scaled = value * power if digits >= 0 else value / power
    if scaled.rel_accuracy_bits() < _ACCURACY_BITS:
        return None
    bottom, top = _integer(scaled.lower().floor()), _integer(scaled.upper().ceil())
    if (top - bottom) > min(abs(bottom), abs(top)) * RELATIVE_WIDTH:
        return None
    return _decimal(bottom, digits), _decimal(top, digits)


def _integer(exact: flint.arb) -> int:
    mantissa, exponent = exact.man_exp()
    return int(mantissa) << int(exponent)


def _decimal(value: int, digits: int) -> str:
    sign, text = ("-" if value < 0 else ""), str(flint.fmpz(abs(value)))
    first = len(text) - 1 - digits
    if -5 <= first <= 25:
        if digits <= 0:
            return sign + text + "0" * -digits
        text = text.rjust(digits + 1, "0")
        return f"{sign}{text[:-digits]}.{text[-digits:]}"
    return f"{sign}{text[0]}.{text[1:]}e{first:+d}"


def nonzero_somewhere(node: Expression) -> bool:
    """Return whether an enclosure at a point of positive values excludes zero.

    True proves that the expression does not vanish identically; False proves nothing.
    """
    names = sorted(all_symbols(node))
    for trial in range(1, 4):
        with flint.ctx.workprec(256):
            values = {
                name: flint.arb(flint.fmpq(2 * place + 2 * trial + 1, place + trial + 1))
                for place, name in enumerate(names)
            }
            enclosure = ball(node, values)
            if enclosure > 0 or enclosure < 0:
                return True
    return False
