"""Exchange of expressions with SymPy, node by node; no text is evaluated on the way."""

from __future__ import annotations

from collections.abc import Callable
from fractions import Fraction
from functools import partial
from typing import Any

from symbolic_response.errors import EvaluationError, ExpressionError, SizeLimitError
from symbolic_response.expressions.hyperbolic import HYPERBOLIC, hyperbolic
from symbolic_response.expressions.names import NAME
from symbolic_response.expressions.reader import MAX_EXPONENT
from symbolic_response.expressions.tree import (
    ONE,
    Expression,
    Function,
    Number,
    Power,
    Product,
    Sum,
    Symbol,
    add,
    function,
    multiply,
    number,
    power,
)


def expression_to_sympy(node: Expression, positive: frozenset[str] = frozenset()) -> Any:
    """Return ``node`` as a SymPy expression; symbols in ``positive`` positive, the others real.

    >>> from symbolic_response.expressions.reader import read_expression
    >>> expression_to_sympy(read_expression("sqrt(a)*exp(-F)"), frozenset("a"))
    sqrt(a)*exp(-F)
    """
    import sympy

    match node:
        case Number(value):
            return sympy.Rational(value.numerator, value.denominator)
        case Symbol(name):
            sign = {"positive": True} if name in positive else {"real": True}
            return sympy.Symbol(name, **sign)
        case Sum(parts):
            return sympy.Add(*(expression_to_sympy(part, positive) for part in parts))
        case Product(parts):
            return sympy.Mul(*(expression_to_sympy(part, positive) for part in parts))
        case Power(base, exponent):
            exact = sympy.Rational(exponent.numerator, exponent.denominator)
            return sympy.Pow(expression_to_sympy(base, positive), exact)
        case Function(name, argument):
            made = sympy.exp if name == "exp" else sympy.log
            return made(expression_to_sympy(argument, positive))
    raise TypeError(f"not a node of an expression: {type(node).__name__}")


def expression_from_sympy(expression: Any) -> Expression:
    """Return a SymPy expression as ours.

    Sums, products, rational powers, ``exp``, ``log``, hyperbolic functions (written with ``exp``),
    symbols and rational numbers are known.
    Raises ExpressionError for all else, floating-point numbers included.

    >>> import sympy
    >>> expression_from_sympy(sympy.Rational(3, 6))
    Number(value=Fraction(1, 2))
    """
    try:
        return _from_sympy(expression)
    except RecursionError:
        raise ExpressionError("the SymPy expression is nested too deeply") from None
    except (EvaluationError, SizeLimitError) as error:
        raise ExpressionError(f"the SymPy expression cannot be used: {error}") from None


def _from_sympy(node: Any) -> Expression:
    import sympy

    if isinstance(node, sympy.Rational) and node.is_finite:
        return number(_fraction(node))
    if isinstance(node, sympy.Symbol):
        if not NAME.fullmatch(node.name):
            raise ExpressionError(f"the SymPy symbol {node.name!r} is not a name; begin with an "
                                  "ASCII letter, then letters, digits or _")
        return Symbol(node.name)
    if node is sympy.E:
        return function("exp", ONE)
    if isinstance(node, sympy.Pow):
        return _power(node)
    known: dict[Any, Callable[[list[Expression]], Expression]] = {
        sympy.Add: add,
        sympy.Mul: multiply,
        sympy.exp: lambda parts: function("exp", parts[0]),
        sympy.log: lambda parts: function("ln", parts[0]),
        **{getattr(sympy, name): partial(_hyperbolic, name) for name in HYPERBOLIC},
    }
    if getattr(node, "func", None) in known:
        return known[node.func]([_from_sympy(part) for part in node.args])
    hint = "write an exact Rational" if isinstance(node, sympy.Float) else (
        "write it with sums, products, rational powers, exp, log and hyperbolic functions"
    )
    raise ExpressionError(f"a SymPy {type(node).__name__} cannot be used; {hint}")


def _hyperbolic(name: str, parts: list[Expression]) -> Expression:
    return hyperbolic(name, parts[0])


def _power(node: Any) -> Expression:
    import sympy

    base, exponent = node.args
    if exponent.is_number and not isinstance(exponent, sympy.Rational) and exponent.has(
        sympy.Float, sympy.zoo, sympy.oo, sympy.nan
    ):
        raise ExpressionError("a SymPy power has an exponent that is not exact; write a Rational")
    if not isinstance(exponent, sympy.Rational) or not exponent.is_finite:
        # SymPy itself writes exp(exp(2)*log(x)) as x**exp(2)
        return function("exp", multiply([_from_sympy(exponent),
                                         function("ln", _from_sympy(base))]))
    exact = _fraction(exponent)
    if abs(exact) > MAX_EXPONENT or exact.denominator > MAX_EXPONENT:
        raise ExpressionError(f"a SymPy power has an exponent larger than {MAX_EXPONENT}, in size "
                              "or in its denominator; write a smaller one")
    return power(_from_sympy(base), exact)


def _fraction(value: Any) -> Fraction:
    return Fraction(int(value.p), int(value.q))
