"""Expressions: read once, then evaluated exactly at many points, with a derivative.

A value is a fraction, or a fraction plus a formal sum of fractions times logarithms of fractions.
The exponential of a sum of logarithms is a product of powers, and must come out as a fraction.
"""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import dataclass
from fractions import Fraction
from math import isqrt, lcm

from .reading import Work, malformed, shown, too_large

MAX_LENGTH = 100_000
MAX_DEPTH = 60
MAX_NUMBER = 1_000  # digits of a number in an expression
MAX_EXPONENT = 64
MAX_BITS = 400_000

_TOKEN = re.compile(
    r"\s*(?:(?P<number>(?:[0-9]+(?:\.[0-9]*)?|\.[0-9]+)(?:[eE][+-]?[0-9]+)?)(?![\w.])"
    r"|(?P<name>[A-Za-z][A-Za-z0-9_]*)|(?P<sign>\*\*|[-+*/()])|(?P<end>\Z))", re.ASCII)
FUNCTIONS = ("exp", "ln", "sqrt")


class Inexact(Exception):
    """An expression has no exact value of the kinds above at a point."""


@dataclass(frozen=True)
class Logs:
    """``rational`` plus the sum of ``parts[q] * ln(q)``, every q above 1."""

    parts: dict[Fraction, Fraction]
    rational: Fraction


Value = Fraction | Logs
Dual = tuple[Value, Value]  # a value and its derivative
ZERO, ONE = Fraction(0), Fraction(1)


@dataclass(frozen=True)
class Expression:
    """A text and its operations in the order of a stack machine."""

    text: str
    program: tuple[tuple[str, str | Fraction], ...]
    symbols: frozenset[str]

    def at(self, point: Mapping[str, Dual], work: Work) -> tuple[Fraction, Fraction]:
        """Return value and derivative, both fractions; raises Inexact."""
        value, change = run(self.program, point, work)
        if isinstance(value, Logs) or isinstance(change, Logs):
            raise Inexact("a value that is not a fraction")
        return value, change


def read(text: object, entry: str, symbols: Mapping[str, object]) -> Expression:
    """Read an expression over the given symbols."""
    if type(text) is not str:
        raise malformed(entry, "an expression", text)
    if len(text) > MAX_LENGTH:
        raise too_large(entry, MAX_LENGTH, f"{len(text)} characters")
    reader = _Reader(text, entry)
    reader.sum(0)
    if reader.kind != "end":
        raise malformed(entry, "an operator", shown(reader.token))
    used = frozenset(str(what) for kind, what in reader.program if kind == "symbol")
    for symbol in sorted(used):
        if symbol not in symbols:
            raise malformed(entry, "symbols of the network", shown(symbol))
    return Expression(text, tuple(reader.program), used)


class _Reader:
    def __init__(self, text: str, entry: str) -> None:
        self.text, self.entry, self.position = text, entry, 0
        self.program: list[tuple[str, str | Fraction]] = []
        self.next()

    def next(self) -> None:
        found = _TOKEN.match(self.text, self.position)
        if found is None or found.lastgroup is None:
            raise malformed(self.entry, "an expression", f"something else at {self.position}")
        self.kind, self.token = found.lastgroup, found.group(found.lastgroup)
        self.position = found.end()

    def emit(self, operation: str, what: str | Fraction = "") -> None:
        self.program.append((operation, what))

    def sum(self, depth: int) -> None:
        self.product(depth)
        while (sign := self.token) in ("+", "-") and self.kind == "sign":
            self.next()
            self.product(depth)
            self.emit(sign)

    def product(self, depth: int) -> None:
        self.signed(depth)
        while (sign := self.token) in ("*", "/"):
            self.next()
            self.signed(depth)
            self.emit(sign)

    def signed(self, depth: int) -> None:
        if depth > MAX_DEPTH:
            raise too_large(self.entry, MAX_DEPTH, "deeper nesting")
        if self.token in ("+", "-"):
            sign = self.token
            self.next()
            self.signed(depth + 1)
            if sign == "-":
                self.emit("negative")
            return
        self.operand(depth)
        if self.token == "**":
            start = len(self.program)
            self.next()
            self.signed(depth + 1)
            exponent = self.exponent(self.program[start:])
            del self.program[start:]
            self.emit("**", exponent)

    def exponent(self, program: list[tuple[str, str | Fraction]]) -> Fraction:
        try:
            value, _ = run(tuple(program), {}, Work(10**6))
        except (KeyError, Inexact):
            raise malformed(self.entry, "an exponent that is an exact number", "others") from None
        if isinstance(value, Logs) or abs(value) > MAX_EXPONENT or (
                value.denominator > MAX_EXPONENT):
            raise malformed(self.entry, f"an exponent up to {MAX_EXPONENT}", "another")
        return value

    def operand(self, depth: int) -> None:
        kind, token = self.kind, self.token
        self.next()
        if kind == "number":
            self.number(token)
        elif kind == "name" and self.token == "(" and token in FUNCTIONS:
            self.next()
            self.bracket(depth)
            self.emit(token)
        elif kind == "name":
            self.emit("symbol", token)
        elif token == "(":
            self.bracket(depth)
        else:
            raise malformed(self.entry, "a value in the expression", shown(token))

    def bracket(self, depth: int) -> None:
        self.sum(depth + 1)
        if self.token != ")":
            raise malformed(self.entry, "a closing parenthesis", shown(self.token))
        self.next()

    def number(self, token: str) -> None:
        digits, _, power = token.lower().partition("e")
        if len(digits) > MAX_NUMBER or len(power) > 5 or abs(int(power or "0")) > MAX_NUMBER:
            raise too_large(self.entry, MAX_NUMBER, "a longer number")
        self.emit("number", Fraction(token))


def run(program: tuple[tuple[str, str | Fraction], ...], point: Mapping[str, Dual],
        work: Work) -> Dual:
    """Evaluate with derivative; raises Inexact, and KeyError for a symbol without value."""
    stack: list[Dual] = []
    for operation, what in program:
        if operation == "number" and isinstance(what, Fraction):
            stack.append((what, ZERO))
        elif operation == "symbol":
            stack.append(point[str(what)])
        elif operation == "**" and isinstance(what, Fraction):
            stack.append(_raise(stack.pop(), what))
        elif operation in _UNARY:
            stack.append(_UNARY[operation](stack.pop()))
        else:
            right = stack.pop()
            stack.append(_BINARY[operation](stack.pop(), right))
        work.charge(1, max(bits(stack[-1][0]), bits(stack[-1][1])))
    return stack[0]


def bits(value: Value) -> int:
    """Return the size of a value in bits; stops at values that are too large."""
    if isinstance(value, Logs):
        return sum(bits(q) + bits(m) for q, m in value.parts.items()) + bits(value.rational)
    size = max(value.numerator.bit_length(), value.denominator.bit_length())
    if size > MAX_BITS:
        raise too_large("values", MAX_BITS, "more bits")
    return size


def plus(a: Value, b: Value) -> Value:
    if isinstance(a, Fraction) and isinstance(b, Fraction):
        return a + b
    one, two = _logs(a), _logs(b)
    parts = dict(one.parts)
    for q, m in two.parts.items():
        parts[q] = parts.get(q, ZERO) + m
    return _tidy(parts, one.rational + two.rational)


def times(a: Value, b: Value) -> Value:
    if isinstance(a, Logs):
        a, b = b, a
    if isinstance(a, Logs):
        raise Inexact("a product of logarithms")
    if isinstance(b, Fraction):
        return a * b
    return _tidy({q: a * m for q, m in b.parts.items()}, a * b.rational)


def log(q: Value) -> Value:
    """Return ln(q) as a formal sum."""
    if isinstance(q, Logs) or q <= 0:
        raise Inexact("the logarithm of what is not a positive fraction")
    return _tidy({q: ONE}, ZERO) if q >= 1 else _tidy({1 / q: -ONE}, ZERO)


def _logs(value: Value) -> Logs:
    return value if isinstance(value, Logs) else Logs({}, value)


def _tidy(parts: dict[Fraction, Fraction], rational: Fraction) -> Value:
    kept = {q: m for q, m in parts.items() if m and q != 1}
    return Logs(kept, rational) if kept else rational


def power(q: Fraction, exponent: Fraction) -> Fraction:
    """Return q to a rational power where it is a fraction."""
    top, bottom = exponent.numerator, exponent.denominator
    if q <= 0 and (bottom > 1 or (q == 0 and top < 0)):
        if q == 0 and top > 0:
            return ZERO
        raise Inexact("a power that does not exist")
    if bits(q) * abs(top) > MAX_BITS:
        raise too_large("values", MAX_BITS, "more bits")
    raised = q**top
    return raised if bottom == 1 else Fraction(_root(raised.numerator, bottom),
                                               _root(raised.denominator, bottom))


def _root(number: int, degree: int) -> int:
    """Return the exact root of a positive integer (by Newton's method, from above)."""
    root = isqrt(number) if degree == 2 else 1 << (number.bit_length() // degree + 1)
    while degree > 2:
        closer = ((degree - 1) * root + number // root ** (degree - 1)) // degree
        if closer >= root:
            break
        root = closer
    if root**degree != number:
        raise Inexact("an irrational root")
    return root


def _exponential(value: Value) -> Fraction:
    logs = _logs(value)
    if logs.rational:
        raise Inexact("the exponential of a fraction")
    degree = lcm(*(m.denominator for m in logs.parts.values()))
    if degree > MAX_EXPONENT or sum(bits(q) * abs(m) for q, m in logs.parts.items()) > MAX_BITS:
        raise too_large("values", MAX_BITS, "more bits")
    product = ONE
    for q, m in logs.parts.items():
        product *= power(q, m * degree)
    return power(product, Fraction(1, degree))


def _add(a: Dual, b: Dual) -> Dual:
    return plus(a[0], b[0]), plus(a[1], b[1])


def _negative(a: Dual) -> Dual:
    return times(-ONE, a[0]), times(-ONE, a[1])


def _multiply(a: Dual, b: Dual) -> Dual:
    if not a[1] and not b[1]:
        return times(a[0], b[0]), ZERO
    return times(a[0], b[0]), plus(times(a[1], b[0]), times(a[0], b[1]))


def _raise(a: Dual, exponent: Fraction) -> Dual:
    base, change = a
    if exponent == 1:
        return a
    if isinstance(base, Logs):
        raise Inexact("a power of a logarithm")
    value = power(base, exponent)
    if not change or not exponent:
        return value, ZERO
    return value, times(exponent * power(base, exponent - 1), change)


def _exp(a: Dual) -> Dual:
    value = _exponential(a[0])
    return value, times(value, a[1])


def _ln(a: Dual) -> Dual:
    return log(a[0]), times(power(a[0], -ONE), a[1]) if isinstance(a[0], Fraction) else ZERO


def _root_of(a: Dual) -> Dual:
    return _raise(a, ONE / 2)


def _subtract(a: Dual, b: Dual) -> Dual:
    return _add(a, _negative(b))


def _divide(a: Dual, b: Dual) -> Dual:
    return _multiply(a, _raise(b, -ONE))


_UNARY = {"negative": _negative, "exp": _exp, "ln": _ln, "sqrt": _root_of}
_BINARY = {"+": _add, "-": _subtract, "*": _multiply, "/": _divide}
