"""Reading expressions: a tokenizer and an iterative precedence parser.

Nothing that is read can run: the reader knows numbers, names, operators, brackets and three
functions, and bounds length, nesting and digits before it trusts them.
"""

from __future__ import annotations

import re
from collections.abc import Callable
from dataclasses import dataclass, field
from fractions import Fraction

from symbolic_response.errors import EvaluationError, ExpressionError, SizeLimitError
from symbolic_response.expressions.tree import (
    Expression,
    Number,
    Symbol,
    add,
    function,
    multiply,
    negate,
    number,
    power,
)

MAX_LENGTH = 500_000
MAX_NESTING = 60
MAX_DIGITS = 1_000
MAX_EXPONENT = 64

_TOKEN = re.compile(
    r"\s*(?:(?P<number>(?:[0-9]+(?:\.[0-9]*)?|\.[0-9]+)(?:[eE][+-]?[0-9]+)?)"
    r"|(?P<name>[A-Za-z][A-Za-z0-9_]*)"
    r"|(?P<op>\*\*|[-+*/(),\[\]]))",
    re.ASCII,
)
_SPACE = re.compile(r"\s*")
_HINTS = {"^": "; write ** for a power", "=": "; a single expression is expected here"}


@dataclass(frozen=True, slots=True)
class Token:
    """``kind`` is ``number``, ``name``, ``op`` or ``end``; ``position`` counts characters."""

    kind: str
    text: str
    position: int


AtomReader = Callable[[list[Token], int], tuple[Expression, int] | None]


def tokenize(text: str) -> list[Token]:
    """Return the tokens of ``text``, the last one of kind ``end``.

    Raises ExpressionError at the first character that cannot begin a token, for a text longer
    than 500,000 characters, and for a number of more than 1,000 digits.
    """
    if len(text) > MAX_LENGTH:
        raise ExpressionError(
            f"the expression is {len(text)} characters long; at most {MAX_LENGTH} are read"
        )
    tokens: list[Token] = []
    position = 0
    while (start := _end_of_space(text, position)) < len(text):
        found = _TOKEN.match(text, start)
        if found is None or found.lastgroup is None:
            character = text[start]
            shown = character if character.isprintable() else repr(character)
            raise ExpressionError(
                f"the character {shown!r} does not belong in an expression"
                + _HINTS.get(character, ""),
                start,
            )
        if found.lastgroup == "number":
            _check_digits(found.group("number"), start)
        tokens.append(Token(found.lastgroup, found.group(found.lastgroup), start))
        position = found.end()
        if found.lastgroup == "number" and position < len(text) and _joins(text[position]):
            raise ExpressionError(
                f"{found.group('number')!r} runs into {text[position]!r}; "
                "write * for a product, and begin a name with a letter",
                position,
            )
    tokens.append(Token("end", "", len(text)))
    return tokens


def _end_of_space(text: str, position: int) -> int:
    found = _SPACE.match(text, position)
    return found.end() if found else position


def _joins(character: str) -> bool:
    return character.isalnum() or character in "_."


def _check_digits(text: str, position: int) -> None:
    mantissa, _, exponent = text.lower().partition("e")
    if len(mantissa) > MAX_DIGITS or len(exponent) > 5 or abs(int(exponent or "0")) > MAX_DIGITS:
        raise ExpressionError(f"a number of more than {MAX_DIGITS} digits", position)


def read_expression(text: str) -> Expression:
    """Return the tree of an expression in the syntax of the network file.

    ``+ - * / ** ( )``, exact integers, fractions and decimals, names, ``exp``, ``ln``, ``sqrt``.
    Exponents are exact rationals of size at most 64. Raises ExpressionError.

    >>> read_expression("0.1*c")
    Product(factors=(Number(value=Fraction(1, 10)), Symbol(name='c')))
    """
    return read_tokens(tokenize(text), no_atoms)


def read_tokens(tokens: list[Token], atoms: AtomReader) -> Expression:
    """Read a whole token list (its last token of kind ``end``).

    ``atoms(tokens, index)`` is asked first wherever an operand may begin: it answers None, or
    the operand and the index after it.
    """
    parser = _Parser(tokens, atoms)
    try:
        return parser.run()
    except (EvaluationError, SizeLimitError) as error:
        raise ExpressionError(str(error), parser.here().position) from None


def no_atoms(tokens: list[Token], index: int) -> None:
    """Offer no operands beyond numbers, symbols and functions."""


_BINARY = {"+": 1, "-": 1, "*": 2, "/": 2, "**": 4}
_SIGN = 3  # a leading sign binds more loosely than ** and more tightly than *


@dataclass(slots=True)
class _Parser:
    tokens: list[Token]
    atoms: AtomReader
    index: int = 0
    operands: list[Expression] = field(default_factory=list)
    operators: list[tuple[str, int]] = field(default_factory=list)  # text, position
    depth: int = 0

    def here(self) -> Token:
        return self.tokens[min(self.index, len(self.tokens) - 1)]

    def run(self) -> Expression:
        while True:
            self.read_operand()
            if not self.read_operator():
                break
        self.reduce(0)
        if self.operators:
            raise ExpressionError("an opening parenthesis is never closed", self.operators[-1][1])
        return self.operands[0]

    def read_operand(self) -> None:
        """Read signs, opening parentheses and function names up to and including an operand."""
        while True:
            token = self.here()
            if (found := self.atoms(self.tokens, self.index)) is not None:
                self.operands.append(found[0])
                self.index = found[1]
                return
            if token.text in ("+", "-"):
                self.open("sign" + token.text, token)
            elif token.text == "(":
                self.open("(", token)
            elif token.kind == "name" and self.tokens[self.index + 1].text == "(":
                self.open(_known_function(token), token)
                self.index += 1
            else:
                self.operands.append(_leaf(token))
                self.index += 1
                return

    def open(self, operator: str, token: Token) -> None:
        self.depth += 1
        if self.depth > MAX_NESTING:
            raise ExpressionError(f"nested more than {MAX_NESTING} deep", token.position)
        self.operators.append((operator, token.position))
        self.index += 1

    def read_operator(self) -> bool:
        """Read closing parentheses and one binary operator; False at the end."""
        while (token := self.here()).text == ")":
            self.reduce(0)
            if not self.operators:
                raise ExpressionError("a closing parenthesis without an opening one",
                                      token.position)
            opened, _ = self.operators.pop()
            self.depth -= 1
            if opened != "(":
                self.operands[-1] = _apply_function(opened, self.operands[-1])
            self.index += 1
        if token.kind == "end":
            return False
        if token.text not in _BINARY:
            raise ExpressionError(
                f"{token.text!r} cannot follow here; an operator such as * is missing",
                token.position,
            )
        # operators of one strength wait for each other, so that a long sum is one node
        self.reduce(_BINARY[token.text] + 1)
        self.operators.append((token.text, token.position))
        self.index += 1
        return True

    def reduce(self, level: int) -> None:
        """Apply the pending operators that bind at least as tightly as ``level``."""
        while self.operators and (strength := _strength(self.operators[-1][0])) >= max(level, 1):
            if strength == _SIGN:
                self.depth -= 1
                if self.operators.pop()[0] == "sign-":
                    self.operands[-1] = negate(self.operands[-1])
            elif strength == _BINARY["**"]:
                position = self.operators.pop()[1]
                exponent = self.operands.pop()
                self.operands[-1] = _apply_power(self.operands[-1], exponent, position)
            else:
                self.reduce_run(strength)

    def reduce_run(self, strength: int) -> None:
        """Apply a run of ``+ -`` or of ``* /`` as one sum or one product."""
        start = len(self.operators)
        while start and _strength(self.operators[start - 1][0]) == strength:
            start -= 1
        run = self.operators[start:]
        del self.operators[start:]
        first = len(self.operands) - len(run)
        parts = self.operands[first:]
        for place, (operator, position) in enumerate(run):
            if operator == "-":
                parts[place] = negate(parts[place])
            elif operator == "/":
                parts[place] = _reciprocal(parts[place], position)
        tree = add if strength == _BINARY["+"] else multiply
        self.operands[first - 1 :] = [tree([self.operands[first - 1], *parts])]


def _strength(operator: str) -> int:
    return _SIGN if operator.startswith("sign") else _BINARY.get(operator, -1)


def _known_function(token: Token) -> str:
    if token.text in ("exp", "ln", "sqrt"):
        return token.text
    hint = "; write ln for the natural logarithm" if token.text == "log" else (
        "; the functions are exp, ln and sqrt, and a product needs *"
    )
    raise ExpressionError(f"{token.text!r} is not a function{hint}", token.position)


def _leaf(token: Token) -> Expression:
    if token.kind == "number":
        return number(Fraction(token.text))
    if token.kind == "name":
        return Symbol(token.text)
    if token.kind == "end":
        raise ExpressionError("the expression ends where a value is expected", token.position)
    raise ExpressionError(f"a value is expected before {token.text!r}", token.position)


def _apply_function(name: str, argument: Expression) -> Expression:
    return power(argument, Fraction(1, 2)) if name == "sqrt" else function(name, argument)


def _reciprocal(divisor: Expression, position: int) -> Expression:
    try:
        return power(divisor, -1)
    except EvaluationError as error:
        raise ExpressionError(str(error), position) from None


def _apply_power(base: Expression, exponent: Expression, position: int) -> Expression:
    if not isinstance(exponent, Number):
        raise ExpressionError(
            "an exponent must be an exact number; write exp(n*ln(x)) for x to the power n", position
        )
    value = exponent.value
    if abs(value.numerator) > MAX_EXPONENT * value.denominator or value.denominator > MAX_EXPONENT:
        raise ExpressionError(
            f"an exponent is larger than {MAX_EXPONENT}, in size or in its denominator", position
        )
    try:
        return power(base, value)
    except (EvaluationError, SizeLimitError) as error:
        raise ExpressionError(str(error), position) from None
