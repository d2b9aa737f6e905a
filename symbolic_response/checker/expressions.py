"""Expressions: read once, then evaluated exactly at many points, with a derivative.

A value is a fraction or a sum of multiples of logarithms {q: m}, that is of m * ln(q). The
exponential of such a sum is a product of powers, and must come out as a fraction.
"""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import dataclass
from fractions import Fraction
from math import isqrt, lcm

from .reading import Work, malformed, too_large

MAX_LENGTH, MAX_DEPTH, MAX_NUMBER = 100_000, 60, 1_000  # characters, nesting, digits of a number
MAX_EXPONENT, MAX_BITS = 64, 400_000

_TOKEN = re.compile(
    r"\s*(?:(?P<number>(?:[0-9]+(?:\.[0-9]*)?|\.[0-9]+)(?:[eE][+-]?[0-9]+)?)(?![\w.])"
    r"|(?P<name>[A-Za-z][A-Za-z0-9_]*)|(?P<sign>\*\*|[-+*/()])|(?P<end>\Z))", re.ASCII)
_STRENGTH = {"+": 1, "-": 1, "*": 2, "/": 2, "**": 4}
_SIGN = 3  # a leading sign: looser than a power, tighter than a product
FUNCTIONS = ("exp", "ln", "sqrt")

Value = Fraction | dict[Fraction, Fraction]
Dual = tuple[Value, Value]  # a value and its derivative
Program = tuple[tuple[str, str | Fraction], ...]  # operations in the order of a stack machine
ZERO, ONE, HALF = Fraction(0), Fraction(1), Fraction(1, 2)


class Inexact(Exception):
    """An expression has no exact value of the kinds above at a point."""


@dataclass(frozen=True)
class Expression:
    """A text, what it does, and the symbols in it."""

    text: str
    program: Program
    symbols: frozenset[str]

    def at(self, point: Mapping[str, Dual], work: Work) -> tuple[Fraction, Fraction]:
        """Return value and derivative, both fractions; raises Inexact."""
        value, change = run(self.program, point, work)
        if isinstance(value, dict) or isinstance(change, dict):
            raise Inexact("a value that is not a fraction")
        return value, change


def read(text: object, entry: str, symbols: Mapping[str, object]) -> Expression:
    """Read an expression over the given symbols."""
    if type(text) is not str:
        raise malformed(entry, "an expression", text)
    if len(text) > MAX_LENGTH:
        raise too_large(entry, MAX_LENGTH, f"{len(text)} characters")
    reader = _Reader(text, entry)
    reader.read(0, 0)
    if reader.kind != "end":
        raise malformed(entry, "an operator", reader.token)
    used = frozenset(str(what) for kind, what in reader.program if kind == "symbol")
    for symbol in sorted(used - set(symbols)):
        raise malformed(entry, "symbols of the network", symbol)
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

    def read(self, strength: int, depth: int) -> None:
        """Read an operand and the operators after it that bind more tightly than ``strength``."""
        if depth > MAX_DEPTH:
            raise too_large(self.entry, MAX_DEPTH, "deeper nesting")
        self.operand(depth)
        while (level := _STRENGTH.get(self.token, 0)) > strength:
            sign, start = self.token, len(self.program)
            self.next()
            self.read(_SIGN if sign == "**" else level, depth + (sign == "**"))
            exponent: str | Fraction = ""
            if sign == "**":
                exponent = self.exponent(tuple(self.program[start:]))
                del self.program[start:]
            self.program.append((sign, exponent))

    def operand(self, depth: int) -> None:
        kind, token = self.kind, self.token
        self.next()
        if token in ("+", "-"):
            self.read(_SIGN, depth + 1)
            if token == "-":
                self.program += [("number", -ONE), ("*", "")]
        elif token == "(" or (token in FUNCTIONS and self.token == "("):
            if token != "(":
                self.next()
            self.read(0, depth + 1)
            if self.token != ")":
                raise malformed(self.entry, "a closing parenthesis", self.token or "the end")
            self.next()
            if token != "(":
                self.program.append((token, "") if token != "sqrt" else ("**", HALF))
        elif kind == "number":
            digits, _, power = token.lower().partition("e")
            if len(digits) > MAX_NUMBER or len(power) > 5 or abs(int(power or 0)) > MAX_NUMBER:
                raise too_large(self.entry, MAX_NUMBER, "a longer number")
            self.program.append(("number", Fraction(token)))
        elif kind == "name":
            self.program.append(("symbol", token))
        else:
            raise malformed(self.entry, "a value in the expression", token or "the end")

    def exponent(self, program: Program) -> Fraction:
        try:
            value, _ = run(program, {}, Work(10**6))
        except (KeyError, Inexact):
            raise malformed(self.entry, "an exponent that is an exact number", "others") from None
        if isinstance(value, dict) or abs(value) > MAX_EXPONENT or (
                value.denominator > MAX_EXPONENT):
            raise malformed(self.entry, f"an exponent up to {MAX_EXPONENT}", "another")
        return value


def run(program: Program, point: Mapping[str, Dual], work: Work) -> Dual:
    """Evaluate with derivative; raises Inexact, and KeyError for a symbol without value."""
    stack: list[Dual] = []
    for operation, what in program:
        if operation == "number" and isinstance(what, Fraction):
            new: Dual = what, ZERO
        elif operation == "symbol":
            new = point[str(what)]
        elif operation == "**" and isinstance(what, Fraction):
            new = _raise(stack.pop(), what)
        elif operation == "exp":
            value, change = stack.pop()
            power = exponential(value)
            new = power, times(power, change)
        elif operation == "ln":
            value, change = stack.pop()
            new = log(value), times(_raise((value, ZERO), -ONE)[0], change)
        else:
            (b, db), (a, da) = stack.pop(), stack.pop()
            if operation in "+-":
                sign = ONE if operation == "+" else -ONE
                new = plus(a, times(sign, b)), plus(da, times(sign, db))
            else:
                if operation == "/":
                    b, db = _raise((b, db), -ONE)
                new = times(a, b), plus(times(da, b), times(a, db)) if da or db else ZERO
        work.charge(1, max(bits(new[0]), bits(new[1])))
        stack.append(new)
    return stack[0]


def bits(value: Value) -> int:
    """Return the size of a value in bits; stops at values that are too large."""
    if isinstance(value, dict):
        return sum(bits(q) + bits(m) for q, m in value.items())
    size = max(value.numerator.bit_length(), value.denominator.bit_length())
    if size > MAX_BITS:
        raise too_large("values", MAX_BITS, "more bits")
    return size


def plus(a: Value, b: Value) -> Value:
    """Return the sum of two values of one kind (0 is of both)."""
    if not a or not b:
        return a or b
    if isinstance(a, Fraction) and isinstance(b, Fraction):
        return a + b
    if isinstance(a, Fraction) or isinstance(b, Fraction):
        raise Inexact("a logarithm plus a fraction")
    total = {q: a.get(q, ZERO) + b.get(q, ZERO) for q in {**a, **b}}
    return {q: m for q, m in total.items() if m} or ZERO


def times(a: Value, b: Value) -> Value:
    """Return the product of two values, one of them a fraction."""
    if isinstance(a, Fraction) and isinstance(b, Fraction):
        return a * b
    if isinstance(a, dict):
        a, b = b, a
    if isinstance(a, dict) or isinstance(b, Fraction):
        raise Inexact("a product of logarithms")
    return {q: a * m for q, m in b.items()} if a else ZERO


def log(q: Value) -> Value:
    """Return ln(q)."""
    if isinstance(q, dict) or q <= 0:
        raise Inexact("the logarithm of what is not a positive fraction")
    return ZERO if q == 1 else {q: ONE} if q > 1 else {1 / q: -ONE}


def exponential(value: Value) -> Fraction:
    """Return the exponential of a sum of logarithms where it is a fraction."""
    if isinstance(value, Fraction):
        if value:
            raise Inexact("the exponential of a fraction")
        return ONE
    degree, product = lcm(*(m.denominator for m in value.values())), ONE
    if degree > MAX_EXPONENT:
        raise Inexact("a root of too high a degree")
    for q, m in value.items():
        product *= raised(q, m * degree)
        bits(product)
    return raised(product, Fraction(1, degree))


def raised(q: Fraction, exponent: Fraction) -> Fraction:
    """Return q to a rational power where it is a fraction."""
    top, bottom = exponent.numerator, exponent.denominator
    if (q == 0 and top < 0) or (q < 0 and bottom > 1):
        raise Inexact("a division by 0" if q == 0 else "a root of a negative number")
    if bits(q) * abs(top) > MAX_BITS:
        raise too_large("values", MAX_BITS, "more bits")
    power = q**top
    return power if bottom == 1 else Fraction(root(power.numerator, bottom),
                                              root(power.denominator, bottom))


def root(number: int, degree: int) -> int:
    """Return the exact root of an integer from 0 (by Newton's method, from above)."""
    found = isqrt(number) if degree == 2 else 1 << (number.bit_length() // degree + 1)
    while degree > 2:
        closer = ((degree - 1) * found + number // found ** (degree - 1)) // degree
        if closer >= found:
            break
        found = closer
    if found**degree != number:
        raise Inexact("an irrational root")
    return found


def _raise(a: Dual, exponent: Fraction) -> Dual:
    base, change = a
    if exponent == 1:
        return a
    if isinstance(base, dict):
        raise Inexact("a power of a logarithm")
    slope = exponent * raised(base, exponent - 1) if change and exponent else ZERO
    return raised(base, exponent), times(slope, change)
