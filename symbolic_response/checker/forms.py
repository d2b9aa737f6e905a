"""What the form of an expression shows for all values of its symbols: changes and signs."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, replace
from fractions import Fraction
from operator import add, mul, sub

from .expressions import ONE, ZERO, Expression, Inexact, bits, raised
from .reading import Work
from .record import Perturbation


@dataclass(frozen=True)
class Form:
    """What the form of an expression a shows, each None where it does not."""

    number: Fraction | None = None  # a
    sign: int | None = None  # 1 where a is positive, 0 where it is 0
    change: Fraction | None = None  # d ln a/d theta
    slope: Fraction | None = None  # d a/d theta
    real: bool = True  # False where a may not be a real number


def read_form(expression: Expression, positive: Mapping[str, bool], moved: Perturbation,
              work: Work) -> Form:
    """Return what the form of an expression shows."""
    stack: list[Form] = []
    for operation, what in expression.program:
        if operation == "symbol":
            new = _symbol(what == moved.symbol, moved.logarithmic, positive[str(what)])
        elif isinstance(what, Fraction) and operation == "number":
            new = Form(what, None, ZERO, ZERO)
        elif operation in ("exp", "ln"):
            a = stack.pop()
            still = _still(a)
            new = (Form(None, 1 if a.real else None, a.slope, still, a.real)
                   if operation == "exp" else Form(None, None, still, a.change, a.sign == 1))
        elif isinstance(what, Fraction):
            new = _power(stack.pop(), what)
        else:
            b, a = stack.pop(), stack.pop()
            new = (_product(a, _power(b, -ONE) if operation == "/" else b) if operation in "*/"
                   else _sum(a, b, operation))
        if new.number is not None:
            new = replace(new, sign=None if new.number < 0 else int(new.number > 0), real=True)
        work.charge(3, max(bits(x or ZERO) for x in (new.number, new.change, new.slope)))
        stack.append(new)
    return stack[0]


def _known(operation: Callable[..., Fraction], *values: Fraction | None) -> Fraction | None:
    """Return the result of an operation on values that are known, where there is one."""
    try:
        return None if None in values else operation(*values)
    except Inexact:
        return None


def _still(a: Form) -> Fraction | None:
    """Return the slope of a function of a: 0 where that of a is."""
    return ZERO if a.slope == 0 else None


def _symbol(moves: bool, logarithmic: bool, positive: bool) -> Form:
    sign = 1 if positive else None
    if not moves:
        return Form(None, sign, ZERO, ZERO)
    return Form(None, sign, ONE, None) if logarithmic else Form(None, sign, None, ONE)


def _power(a: Form, exponent: Fraction) -> Form:
    whole = exponent >= 0 and exponent.denominator == 1
    return Form(_known(raised, a.number, exponent), 1 if a.sign == 1 else None,
                _known(mul, a.change, exponent), _still(a), a.sign == 1 or (whole and a.real))


def _sum(a: Form, b: Form, operation: str) -> Form:
    function = add if operation == "+" else sub
    sign = None if operation == "-" or a.sign is None or b.sign is None else max(a.sign, b.sign)
    return Form(_known(function, a.number, b.number), sign,
                a.change if a.change == b.change else None, _known(function, a.slope, b.slope),
                a.real and b.real)


def _product(a: Form, b: Form) -> Form:
    sign = None if a.sign is None or b.sign is None else min(a.sign, b.sign)
    slope = ZERO if a.slope == b.slope == 0 else (
        _known(mul, a.number, b.slope) if b.slope else _known(mul, a.slope, b.number))
    return Form(_known(mul, a.number, b.number), sign, _known(add, a.change, b.change), slope,
                a.real and b.real)
