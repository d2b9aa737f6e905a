"""The grammar of formulas, and the expression each of its rules makes.

LALR without conflicts: a sequence of pieces has one reading or none. Sums and products are
gathered in lists, so that long ones are one node.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator, Sequence
from fractions import Fraction
from functools import cache
from typing import Any

from symbolic_response.errors import EvaluationError, SizeLimitError
from symbolic_response.expressions.hyperbolic import HYPERBOLIC, hyperbolic
from symbolic_response.expressions.reader import MAX_EXPONENT
from symbolic_response.expressions.tree import (
    Expression,
    Number,
    add,
    divide,
    function,
    multiply,
    negate,
    number,
    power,
)
from symbolic_response.hand.latex.pieces import Piece

GRAMMAR = """
start: sum
sum: term              -> first
   | PLUS term         -> signed
   | MINUS term        -> signed
   | sum PLUS term     -> another
   | sum MINUS term    -> another
term: factors                  -> product
    | factors SLASH factor     -> quotient
factors: factor                -> one
       | factors factor        -> times
       | factors DOT factor    -> times
?factor: base
       | base CARET group      -> raised
?base: NUMBER                  -> constant
     | NAME                    -> named
     | group
     | BAR group               -> absolute
     | ROOT group              -> root
     | FRACTION group group    -> fraction
     | FUNCTION group          -> applied
     | DERIVATIVE group        -> derivative
?group: OPEN sum CLOSE         -> inside
%declare PLUS MINUS SLASH DOT CARET NUMBER NAME OPEN CLOSE BAR ROOT FRACTION FUNCTION DERIVATIVE
"""


class Refusal(Exception):
    """A piece of a formula that has no value; ``start`` is its place in the source."""

    def __init__(self, message: str, start: int) -> None:
        super().__init__(message)
        self.message, self.start = message, start


def parse(pieces: Sequence[Piece]) -> Expression:
    """Return the expression of a sequence of pieces.

    Raises Refusal where the pieces do not fit together or a value does not exist, SizeLimitError
    for a number past the limit.
    """
    from lark.exceptions import UnexpectedToken

    try:
        made = _parser().parse(pieces)
    except UnexpectedToken as error:
        at = getattr(error.token, "start_pos", None)
        raise Refusal("the formula does not go on like this; write an operator or a bracket here",
                      pieces[-1].start if at is None else at) from None
    assert isinstance(made, Expression)
    return made


@cache
def _parser() -> Any:
    from lark import Lark, Token, Transformer
    from lark.lexer import Lexer

    class Pieces(Lexer):
        def __init__(self, _: Any) -> None:
            """Take no configuration: the pieces are made before."""

        def lex(self, pieces: Iterable[Piece]) -> Iterator[Token]:  # type: ignore[override]
            for piece in pieces:
                token = Token(piece.kind, "", start_pos=piece.start)
                token.value = piece  # a token is a text, and the piece none
                yield token

    actions = {name: staticmethod(action) for name, action in _ACTIONS.items()}
    transformer = type("Actions", (Transformer,), actions)()
    return Lark(GRAMMAR, parser="lalr", lexer=Pieces, transformer=transformer)


# -- what each rule makes: the parts of a rule are tokens with a piece, expressions, lists ---------


def _negated_if(sign: Any, term: Expression) -> Expression:
    return negate(term) if sign.type == "MINUS" else term


def _another(parts: list[Any]) -> Any:
    terms, sign, term = parts
    terms.append(_negated_if(sign, term))
    return terms


def _times(parts: list[Any]) -> Any:
    factors = parts[0]
    factors.append(parts[-1])
    return factors


def _guarded(start: int, make: Callable[[], Expression]) -> Expression:
    try:
        return make()
    except (EvaluationError, SizeLimitError) as error:
        raise Refusal(f"{error}; this has no value here", start) from None


def _quotient(parts: list[Any]) -> Expression:
    factors, slash, below = parts
    return _guarded(slash.value.start, lambda: divide(multiply(factors), below))


def _fraction(parts: list[Any]) -> Expression:
    token, above, below = parts
    return _guarded(token.value.start, lambda: divide(above, below))


def _raised(parts: list[Any]) -> Expression:
    base, caret, exponent = parts
    start = caret.value.start
    if not isinstance(exponent, Number):
        raise Refusal(r"an exponent must be an exact number; write e^{n \ln x}", start)
    value = exponent.value
    largest = MAX_EXPONENT**2  # two powers of a file, one of the other, are printed as one
    if abs(value.numerator) > largest * value.denominator or value.denominator > MAX_EXPONENT:
        raise Refusal(f"an exponent is larger than {largest}, or its denominator than"
                      f" {MAX_EXPONENT}; write a product of powers", start)
    return _guarded(start, lambda: power(base, value))


def _root(parts: list[Any]) -> Expression:
    token, inside = parts
    return _guarded(token.value.start, lambda: power(inside, Fraction(1, token.value.value)))


def _absolute(parts: list[Any]) -> Expression:
    inside = parts[1]
    if isinstance(inside, Number):
        return number(abs(inside.value))
    return power(power(inside, 2), Fraction(1, 2))


def _applied(parts: list[Any]) -> Expression:
    token, argument = parts
    name = token.value.value
    make = hyperbolic if name in HYPERBOLIC else function
    return _guarded(token.value.start, lambda: make(name, argument))


_ACTIONS: dict[str, Callable[[list[Any]], Any]] = {
    "start": lambda parts: add(parts[0]),
    "first": lambda parts: [parts[0]],
    "signed": lambda parts: [_negated_if(*parts)],
    "another": _another,
    "product": lambda parts: multiply(parts[0]),
    "quotient": _quotient,
    "one": lambda parts: [parts[0]],
    "times": _times,
    "raised": _raised,
    "constant": lambda parts: number(parts[0].value.value),
    "named": lambda parts: parts[0].value.value,
    "absolute": _absolute,
    "root": _root,
    "fraction": _fraction,
    "applied": _applied,
    "derivative": lambda parts: parts[0].value.value(parts[1]),
    "inside": lambda parts: add(parts[1]),
}
