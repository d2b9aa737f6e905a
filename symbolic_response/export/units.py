"""The unit of a quantity: powers of time and k_B, for docstrings."""

from __future__ import annotations

from fractions import Fraction

from symbolic_response.expressions.tree import Expression, Function, Number, Power, Product, Sum
from symbolic_response.network.model import Network
from symbolic_response.network.quantities import (
    BySymbol,
    Change,
    Current,
    DirectedRate,
    EntropyProduction,
    Mean,
    Perturbation,
    Probability,
    Response,
    Traffic,
)

Dimension = tuple[Fraction, Fraction] | None
"""The powers of 1/time and k_B; None where symbols or observables decide."""


def unit_of(quantity: Expression, network: Network) -> str:
    """Return the unit of a quantity in words."""
    by: list[Perturbation] = []
    while isinstance(quantity, Response):
        by.append(quantity.perturbation)
        quantity = quantity.quantity
    if isinstance(quantity, Mean):
        unit = f"that of {network.observables[quantity.observable].name}"
    else:
        unit = _words(_dimension(quantity))
    for perturbation in by:
        if not isinstance(perturbation, BySymbol):
            unit += ", per k_B T"
        elif not perturbation.logarithmic:
            unit += f", per unit of {perturbation.name}"
    return unit


def _words(dimension: Dimension) -> str:
    if dimension is None:
        return "that of the symbols and observables it is made of"
    time, boltzmann = dimension
    if time == boltzmann == 0:
        return "none"
    above = "" if boltzmann == 0 else "k_B" if boltzmann == 1 else f"k_B**({boltzmann})"
    if time == 0:
        return above
    return f"{above or 1}/time" if time == 1 else f"{above or 1}/time**({time})"


def _dimension(node: Expression) -> Dimension:
    zero = (Fraction(0), Fraction(0))
    match node:
        case Number() | Probability() | Function():
            return zero
        case Current() | Traffic() | DirectedRate():
            return Fraction(1), Fraction(0)
        case EntropyProduction():
            return Fraction(1), Fraction(1)
        case Change(inner):
            return _dimension(inner)
        case Response(inner, by):
            plain = isinstance(by, BySymbol) and not by.logarithmic
            return None if plain else _dimension(inner)
        case Power(base, exponent):
            inner_ = _dimension(base)
            return None if inner_ is None else (inner_[0] * exponent, inner_[1] * exponent)
        case Product(factors):
            parts = [_dimension(factor) for factor in factors]
            known = [part for part in parts if part is not None]
            if len(known) < len(parts):
                return None
            return sum((p[0] for p in known), zero[0]), sum((p[1] for p in known), zero[1])
        case Sum(terms):
            found = {_dimension(term) for term in terms}
            return found.pop() if len(found) == 1 else None
    return None
