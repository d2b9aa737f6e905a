"""Jets: exact values together with all their mixed first derivatives.

A jet of order k is an element of Q[eps_1 .. eps_k] with every eps_i^2 = 0: 2^k coefficients, the
one of bit set S at index S. A coefficient is None where it is not known to be rational (the
logarithm of a rational number, say); zero times None is zero.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from fractions import Fraction
from typing import TypeAlias

import flint

from symbolic_response.errors import EvaluationError

Scalar: TypeAlias = flint.fmpq | None
Jet: TypeAlias = tuple[Scalar, ...]


def constant_jet(value: Scalar, order: int) -> Jet:
    """Return a constant as a jet."""
    return (value, *[flint.fmpq(0)] * (2**order - 1))


def scalar_product(a: Scalar, b: Scalar) -> Scalar:
    """Return a product in which zero wins over an unknown factor."""
    if a is None:
        return flint.fmpq(0) if b is not None and b == 0 else None
    if b is None:
        return flint.fmpq(0) if a == 0 else None
    return a * b


def jet_sum(jets: Sequence[Jet]) -> Jet:
    """Return a sum of jets of one order."""
    total = list(jets[0])
    for jet in jets[1:]:
        for place, value in enumerate(jet):
            known = total[place]
            total[place] = None if value is None or known is None else known + value
    return tuple(total)


def jet_product(a: Jet, b: Jet) -> Jet:
    """Return the product of two jets: the coefficient of S sums a_T b_(S-T) over T in S."""
    result: list[Scalar] = []
    for whole in range(len(a)):
        total: Scalar = flint.fmpq(0)
        part = whole
        while True:
            term = scalar_product(a[part], b[whole ^ part])
            total = None if term is None or total is None else total + term
            if part == 0:
                break
            part = (part - 1) & whole
        result.append(total)
    return tuple(result)


def scaled_jet(jet: Jet, factor: flint.fmpq) -> Jet:
    """Return a jet times a rational number."""
    return tuple(scalar_product(value, factor) for value in jet)


def _series(jet: Jet, coefficients: Callable[[int], Scalar]) -> Jet:
    """Return sum over j of coefficients(j) nu^j, nu the jet without its constant part."""
    order = (len(jet) - 1).bit_length()
    nilpotent: Jet = (flint.fmpq(0), *jet[1:])
    power = constant_jet(flint.fmpq(1), order)
    terms = []
    for j in range(order + 1):
        factor = coefficients(j)
        terms.append(tuple(scalar_product(value, factor) for value in power))
        power = jet_product(power, nilpotent)
    return jet_sum(terms)


def jet_power(jet: Jet, exponent: Fraction) -> Jet:
    """Return a rational power; EvaluationError for zero to a power that does not exist."""
    base = jet[0]
    if exponent.denominator == 1 and 0 <= exponent <= 64:
        result = constant_jet(flint.fmpq(1), (len(jet) - 1).bit_length())
        for _ in range(int(exponent)):
            result = jet_product(result, jet)
        return result
    if base is None:
        return (None,) * len(jet)
    if base == 0:
        raise EvaluationError("division by zero" if exponent < 0 else "a root of zero")
    head = rational_root(base, exponent)
    if head is None:
        return (None,) * len(jet)
    rational = flint.fmpq(exponent.numerator, exponent.denominator)

    def coefficient(j: int) -> Scalar:
        value = head
        for step in range(j):
            value = value * (rational - step) / ((step + 1) * base)
        return value

    return _series(jet, coefficient)


def rational_root(base: flint.fmpq, exponent: Fraction) -> Scalar:
    """Return ``base ** exponent`` if it is rational; EvaluationError for a negative base."""
    if exponent.denominator == 1:
        return base**exponent.numerator
    if base < 0:
        raise EvaluationError("a root of a negative number")
    top, bottom = (_integer_root(part, exponent.denominator) for part in (base.p, base.q))
    if top is None or bottom is None:
        return None
    return flint.fmpq(top, bottom) ** exponent.numerator


def _integer_root(value: flint.fmpz, index: int) -> flint.fmpz | None:
    root: flint.fmpz = value.root(index)
    return root if root**index == value else None


def jet_logarithm(jet: Jet) -> Jet:
    """Return ln of a jet; its constant part is rational only for ln 1."""
    base = jet[0]
    if base is None:
        return (None,) * len(jet)
    if base <= 0:
        raise EvaluationError("a logarithm of zero or of a negative number")

    def coefficient(j: int) -> Scalar:
        if j == 0:
            return flint.fmpq(0) if base == 1 else None
        return flint.fmpq((-1) ** (j + 1), j) / base**j

    return _series(jet, coefficient)


def jet_exponential(jet: Jet) -> Jet:
    """Return exp of a jet; rational only where its constant part is 0."""
    head: Scalar = flint.fmpq(1) if jet[0] is not None and jet[0] == 0 else None

    def coefficient(j: int) -> Scalar:
        value = head
        for step in range(j):
            value = None if value is None else value / (step + 1)
        return value

    return _series(jet, coefficient)
