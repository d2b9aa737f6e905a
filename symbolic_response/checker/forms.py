"""What the form of an expression shows for all values of its symbols: changes and signs."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from fractions import Fraction

from .expressions import ONE, ZERO, Expression, Inexact, bits, raised
from .reading import Work
from .record import Perturbation


@dataclass(frozen=True)
class Form:
    """Numbers that the form of an expression a shows, each None where it does not."""

    number: Fraction | None  # a
    change: Fraction | None  # d ln a/d theta
    slope: Fraction | None  # d a/d theta


def logarithmic_change(expression: Expression, moved: Perturbation,
                       work: Work) -> Fraction | None:
    """Return d ln w/d theta where the form of w shows that it is a number."""
    stack: list[Form] = []
    for operation, what in expression.program:
        if isinstance(what, Fraction) and operation == "number":
            new = Form(what, ZERO, ZERO)
        elif operation == "symbol" and what == moved.symbol:
            new = Form(None, ONE, None) if moved.logarithmic else Form(None, None, ONE)
        elif operation == "symbol":
            new = Form(None, ZERO, ZERO)
        elif operation in ("exp", "ln", "**"):
            a = stack.pop()
            still = ZERO if a.slope == 0 else None
            if isinstance(what, Fraction):
                new = Form(_power(a.number, what), _times(what, a.change), still)
            else:
                new = Form(None, a.slope if operation == "exp" else still, still)
        else:
            b, a = stack.pop(), stack.pop()
            new = _combined(operation, a, b)
        work.charge(3, max(bits(x or ZERO) for x in (new.number, new.change, new.slope)))
        stack.append(new)
    return stack[0].change


def _combined(operation: str, a: Form, b: Form) -> Form:
    if operation in "+-":
        sign = ONE if operation == "+" else -ONE
        change = a.change if a.change == b.change else None
        return Form(_sum(a.number, _times(sign, b.number)), change,
                    _sum(a.slope, _times(sign, b.slope)))
    if operation == "/":
        b = Form(_power(b.number, -ONE), _times(-ONE, b.change), ZERO if b.slope == 0 else None)
    slope = ZERO if a.slope == b.slope == 0 else (
        _times(a.number, b.slope) if b.slope else _times(a.slope, b.number))
    return Form(_times(a.number, b.number), _sum(a.change, b.change), slope)


def _sum(a: Fraction | None, b: Fraction | None) -> Fraction | None:
    return None if a is None or b is None else a + b


def _times(a: Fraction | None, b: Fraction | None) -> Fraction | None:
    return None if a is None or b is None else a * b


def _power(a: Fraction | None, exponent: Fraction) -> Fraction | None:
    try:
        return None if a is None else raised(a, exponent)
    except Inexact:
        return None


def sign(expression: Expression, positive: Mapping[str, bool], work: Work) -> int | None:
    """Return 1 where the form shows that the value is positive, 0 that it is 0, else None."""
    stack: list[tuple[int | None, Fraction | None]] = []
    for operation, what in expression.program:
        number: Fraction | None = None
        found: int | None = None
        if operation == "symbol":
            found = 1 if positive[str(what)] else None
        elif operation == "number" and isinstance(what, Fraction):
            number = what
        elif operation == "**" and isinstance(what, Fraction):
            base, known = stack.pop()
            number, found = _power(known, what), 1 if base == 1 else None
        elif operation in ("exp", "ln"):
            stack.pop()
            found = 1 if operation == "exp" else None
        else:
            (b, second), (a, first) = stack.pop(), stack.pop()
            both = _combined(operation, Form(first, None, None), Form(second, None, None))
            number = both.number
            if a is not None and b is not None:
                found = {"+": max(a, b), "*": min(a, b), "/": a if b else None}.get(operation)
        if number is not None:
            work.charge(3, bits(number))
            found = None if number < 0 else int(number > 0)
        stack.append((found, number))
    return stack[0][0]
