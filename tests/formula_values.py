r"""Networks for formulas, exact values modulo a prime, and a second reader of LaTeX.

A value is a residue modulo 2^61 - 1: symbols and atoms of quantities take residues made from their
names, sums, products and whole powers are those of the field, and exp, ln, roots and responses are
functions without rules, given by a hash of what they are applied to. Two expressions of equal
value at random residues are the same function up to chance (Schwartz, J. ACM 27, 701 (1980)).
The second reader is a recursive descent over the text which shares no code with the reader
tested: it says what a text means by the common conventions, whether or not it may be ambiguous.
"""

from __future__ import annotations

import hashlib
import re
from fractions import Fraction

from symbolic_response.expressions.tree import (
    Expression,
    Function,
    Number,
    Power,
    Product,
    Sum,
    Symbol,
)
from symbolic_response.network import read_network_text
from symbolic_response.network.quantities import Response
from symbolic_response.network.quantity_reader import read_quantity

PRIME = 2**61 - 1
MOTOR = read_network_text(
    r"""
title = "motor"
[symbols.a]
[symbols.b]
[symbols.c]
[symbols.k_on]
[symbols.k_12]
[symbols.k]
latex = 'k^{+}'
[symbols.mu]
sign = "real"
[symbols.F]
sign = "real"
[symbols.ATP]
[symbols.B_turn]
sign = "real"
[symbols.E_s]
sign = "real"
[symbols.E_t]
sign = "real"
[states.A]
[states.B]
[states.C]
[states.s_0]
energy = "E_s"
[states.t]
energy = "E_t"
[[transitions]]
name = "bind"
between = ["A", "B"]
rates = ["k_on*c", "b*exp(mu)"]
[[transitions]]
name = "set_down"
between = ["B", "C"]
rates = ["k_12*ATP", "k"]
[[transitions]]
between = ["C", "A"]
rates = ["a*exp(F/2)", "a*exp(-F/2)"]
[[transitions]]
name = "slip"
between = ["A", "B"]
rates = ["a", "b"]
[[transitions]]
name = "out"
between = ["C", "s_0"]
rates = ["c", "a"]
[[transitions]]
name = "turn"
between = ["s_0", "t"]
barrier = "B_turn"
[observables.load]
B = 1
"""
)


def hashed(*parts: object) -> int:
    """Return a residue made from parts."""
    digest = hashlib.sha256("|".join(map(str, parts)).encode()).digest()
    return int.from_bytes(digest[:8], "big") % (PRIME - 2) + 2


def value(node: Expression) -> int:
    """Return the residue of an expression; ZeroDivisionError where it has none."""
    match node:
        case Number(exact):
            return residue(exact)
        case Symbol(name):
            return hashed("symbol", name)
        case Sum(terms):
            return sum(map(value, terms)) % PRIME
        case Product(factors):
            return product(map(value, factors))
        case Power(base, exponent):
            return raised(value(base), exponent)
        case Function(name, argument):
            return applied(name, value(argument))
        case Response(quantity, by):
            return hashed("response", value(quantity), by)
    return hashed("atom", node)


def residue(exact: Fraction) -> int:
    return exact.numerator * inverse(exact.denominator) % PRIME


def inverse(number: int) -> int:
    if number % PRIME == 0:
        raise ZeroDivisionError
    return pow(number, PRIME - 2, PRIME)


def product(values: object) -> int:
    result = 1
    for factor in values:  # type: ignore[attr-defined]
        result = result * factor % PRIME
    return result


def raised(base: int, exponent: Fraction) -> int:
    if exponent.denominator != 1:
        base = base if base in (0, 1) else hashed("root", exponent.denominator, base)
    whole = exponent.numerator
    return pow(base, whole, PRIME) if whole >= 0 else pow(inverse(base), -whole, PRIME)


# -- the second reader -----------------------------------------------------------------------------

_TOKEN = re.compile(r"\s+|\\[A-Za-z]+|\\.|.", re.DOTALL)
_FONT = re.compile(r"\\(?:mathrm|text|mathit)\s*(?:\{([^{}]*)\}|([A-Za-z]))")
_DROPPED = {r"\,", r"\;", r"\!", r"\:", r"\ ", r"\>", "~", "&", r"\left", r"\right", r"\bigl",
            r"\bigr", r"\big", r"\Bigl", r"\Bigr", r"\quad"}
_WORDS = ("exp", "ln", "log", "tanh", "sinh", "cosh", "coth")
WRITTEN = {
    "a": "a", "b": "b", "c": "c", "k_{on}": "k_on", "k_{12}": "k_12", "k^{+}": "k", r"\mu": "mu",
    "F": "F", "B_{turn}": "B_turn", "E_{s}": "E_s", "E_{t}": "E_t",
    r"\pi_{A}": "p[A]", r"\pi_{B}": "p[B]", r"\pi_{C}": "p[C]", "p_{A}": "p[A]", "p_{B}": "p[B]",
    "p_{C}": "p[C]", "P_{A}": "p[A]", "P_{B}": "p[B]", "P_{C}": "p[C]", r"\pi_{t}": "p[t]",
    "p_{t}": "p[t]", "P_{t}": "p[t]",
    "A_{bind}": "traffic[bind]", "A_{slip}": "traffic[slip]", "A_{turn}": "traffic[turn]",
    "J_{turn}": "current[turn]", "I_{turn}": "current[turn]", "j_{turn}": "current[turn]",
    "J_{bind}": "current[bind]", "J_{slip}": "current[slip]", "I_{bind}": "current[bind]",
    "I_{slip}": "current[slip]", "j_{slip}": "current[slip]", "j_{bind}": "current[bind]",
    "J_{CA}": "current[C_A]", "I_{CA}": "current[C_A]", "j_{CA}": "current[C_A]",
    "w_{bind}^{+}": "forward[bind]", "w_{bind}^{-}": "backward[bind]",
    "r_{bind}^{+}": "forward[bind]", "r_{bind}^{-}": "backward[bind]",
    "W_{BA}": "forward[bind] + forward[slip]", "W_{AB}": "backward[bind] + backward[slip]",
    "W_{CB}": "forward[set_down]", "W_{BC}": "backward[set_down]", "W_{AC}": "forward[C_A]",
    "W_{CA}": "backward[C_A]",
    "W_{AA}": "-forward[bind] - forward[slip] - backward[C_A]",
    "W_{BB}": "-backward[bind] - backward[slip] - forward[set_down]",
    "W_{CC}": "-backward[set_down] - forward[C_A] - forward[out]",
    "W_{B,A}": "forward[bind] + forward[slip]", "W_{A,B}": "backward[bind] + backward[slip]",
    r"\sigma": "entropy_production", r"\Sigma": "entropy_production",
}


def plain_value(text: str) -> int:
    """Return the value of a quantity in the plain syntax, read by the project's reader of it."""
    return value(read_quantity(text, MOTOR, hyperbolic=True))


def second_value(latex: str) -> int:
    """Return the value of a LaTeX formula; ValueError where this reader knows no reading."""
    tokens = [t for t in _TOKEN.findall(_FONT.sub(lambda m: f" {m[1] or m[2]}", latex))
              if not t.isspace() and t not in _DROPPED]
    return _Second(tokens).whole()


class _Second:
    def __init__(self, tokens: list[str]) -> None:
        self.tokens, self.place, self.bars = tokens, 0, 0

    def next(self) -> str:
        return self.tokens[self.place] if self.place < len(self.tokens) else ""

    def take(self, expected: str = "") -> str:
        token = self.next()
        if not token or (expected and token != expected):
            raise ValueError(f"{token!r} for {expected!r}")
        self.place += 1
        return token

    def whole(self) -> int:
        while self.tokens and self.tokens[-1] in (".", ",", ";"):
            self.tokens.pop()
        result = self.sum()
        if self.next():
            raise ValueError(f"left over {self.next()}")
        return result

    def sum(self) -> int:
        total, sign = 0, 1
        if self.next() in ("+", "-"):
            sign = 1 if self.take() == "+" else -1
        while True:
            total = (total + sign * self.term()) % PRIME
            if self.next() not in ("+", "-"):
                return total
            sign = 1 if self.take() == "+" else -1

    def term(self) -> int:
        result = self.factor()
        while (token := self.next()) not in ("", "+", "-", ")", "]", r"\}", "}", ","):
            if token == "|" and self.bars:
                break
            if token in (r"\cdot", r"\times"):
                self.take()
                result = result * self.factor() % PRIME
            elif token == "/":
                self.take()
                result = result * inverse(self.factor()) % PRIME
            else:
                result = result * self.factor() % PRIME
        return result

    def group(self) -> list[str]:
        """Take a braced group or one token."""
        if self.next() != "{":
            return [self.take()]
        depth, inside = 0, []
        while True:
            token = self.take()
            depth += (token == "{") - (token == "}")
            inside.append(token)
            if depth == 0:
                return inside[1:-1]

    def inner(self) -> int:
        return _Second(self.group()).whole()

    def exponent(self) -> Fraction:
        text = re.sub(r"\\frac(\d)(\d)", r"\1/\2", "".join(self.group()))
        text = re.sub(r"\\frac\{(\d+)\}\{(\d+)\}", r"\1/\2", text)
        return sum((Fraction(term) for term in re.findall(r"[-+]?[^-+]+", text)), Fraction(0))

    def factor(self) -> int:
        base = self.atom()
        if self.next() == "^":
            self.take()
            return raised(base, self.exponent())
        return base

    def atom(self) -> int:
        token = self.take()
        if token.isdigit() or token == ".":
            while self.next().isdigit() or self.next() == ".":
                token += self.take()
            return residue(Fraction(token))
        if token in ("(", "[", r"\{"):
            result = self.sum()
            self.take({"(": ")", "[": "]", r"\{": r"\}"}[token])
            return result
        if token == "|":
            self.bars += 1
            result = self.sum()
            self.take("|")
            self.bars -= 1
            return raised(raised(result, Fraction(2)), Fraction(1, 2))
        if token == "{" and self.next() == "}":
            self.take()
            return self.atom()
        if token == "{":
            self.place -= 1
            return self.inner()
        if token in (r"\frac", r"\tfrac", r"\dfrac"):
            above = self.inner()
            return above * inverse(self.inner()) % PRIME
        if token == r"\sqrt":
            degree = 2
            if self.next() == "[":
                self.take()
                digits = ""
                while self.next() != "]":
                    digits += self.take()
                degree = int(digits)
                self.take("]")
            return raised(self.inner(), Fraction(1, degree))
        if token[1:] in _WORDS:
            return applied(token[1:].replace("log", "ln"), self.atom())
        if token == "e" and self.next() == "^":
            self.take()
            return applied("exp", self.inner())
        if [token, *self.tokens[self.place : self.place + 5]] == [r"\langle", *"load", r"\rangle"]:
            self.place += 5
            return plain_value("mean[load]")
        if token == "A" and self.tokens[self.place : self.place + 2] == ["T", "P"]:
            self.place += 2
            return plain_value("ATP")
        return self.name(token)

    def name(self, nucleus: str) -> int:
        scripts: dict[str, str] = {}
        while self.next() in ("_", "^") and self.next() not in scripts:
            mark = self.next()
            place = self.place
            self.take()
            scripts[mark] = "".join(self.group())
            if mark == "^" and scripts["^"] not in ("+", "-"):
                self.place = place
                del scripts["^"]
                if self.tokens[place + 1 :].count("_") and "_" not in scripts:
                    return self.power_first(nucleus)
                break
        key = nucleus + "".join(f"{m}{{{scripts[m]}}}" for m in "_^" if m in scripts)
        if key not in WRITTEN:
            raise ValueError(f"unknown {key}")
        return plain_value(WRITTEN[key])

    def power_first(self, nucleus: str) -> int:
        """Read a name whose power stands before its subscript."""
        self.take("^")
        exponent = Fraction("".join(self.group()))
        if self.next() != "_":
            return raised(plain_value(WRITTEN[nucleus]), exponent)
        self.take("_")
        return raised(plain_value(WRITTEN[f"{nucleus}_{{{''.join(self.group())}}}"]), exponent)


def applied(name: str, argument: int) -> int:
    """Return a function of a residue; hyperbolic ones by their definition with exp."""
    if name in ("exp", "ln"):
        if (name, argument) in (("exp", 0), ("ln", 1)):
            return 1 if name == "exp" else 0
        return hashed(name, argument)
    up, down = applied("exp", argument), applied("exp", -argument % PRIME)
    if name in ("sinh", "cosh"):
        return (up + (down if name == "cosh" else -down)) * inverse(2) % PRIME
    squared = applied("exp", 2 * argument % PRIME)
    ratio = (squared - 1) * inverse(squared + 1) % PRIME
    return ratio if name == "tanh" else inverse(ratio)
