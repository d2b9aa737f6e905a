"""One rate, or one symbol in all rates, written differently throughout the hand result."""

from __future__ import annotations

from collections.abc import Iterator
from fractions import Fraction
from itertools import islice

from symbolic_response.expressions.text import expression_text
from symbolic_response.expressions.tree import (
    Expression,
    Function,
    Symbol,
    divide,
    function,
    multiply,
    negate,
    number,
    power,
    symbols_of,
    walk,
)
from symbolic_response.hand.diagnosis.case import Case
from symbolic_response.hand.diagnosis.exchanges import Rate, rates_of, renamed, with_rates
from symbolic_response.hand.diagnosis.finding import EXCHANGE, NETWORK, Finding, Ranked
from symbolic_response.hand.diagnosis.products import rate_text
from symbolic_response.network.model import Network

MAX_HYPOTHESES = 400
MAX_FOUND = 2
HALF = Fraction(1, 2)


def rate_findings(case: Case) -> list[Ranked]:
    """Return rates and symbols that the hand result is right for if they are put differently."""
    found: list[Ranked] = []
    for network, text in _by_symbols(case):
        if len(found) < MAX_FOUND and case.is_hand(case.quantity, network):
            found.append(Ranked(EXCHANGE, Finding("term", text)))
    for network, rate, changed in islice(_by_rates(case), MAX_HYPOTHESES):
        if len(found) < MAX_FOUND and case.is_hand(case.quantity, network):
            text = (f"right if the rate {rate_text(rate, case.network)} is put as"
                    f" {expression_text(case.analysis.tidy(changed))} throughout")
            found.append(Ranked(NETWORK, Finding("term", text)))
    return found


def _by_symbols(case: Case) -> Iterator[tuple[Network, str]]:
    """Yield networks with a symbol replaced by its double, its half, its opposite, its inverse."""
    drives = {name for t in case.network.transitions if t.drive is not None
              for name in symbols_of(t.drive)}
    for entry in case.network.symbols:
        old = Symbol(entry.name)
        for new in (multiply([number(2), old]), multiply([number(HALF), old]),
                    power(old, -1) if entry.positive else negate(old)):
            shown = expression_text(new)
            text = f"right if {shown} is put for {entry.name} in all rates"
            if entry.name in drives and shown == f"2*{entry.name}":
                text += ": the factor 1/2 of the drive in each rate is left out"
            if entry.name in drives and new == negate(old):
                text += ": the drive has the opposite sign"
            yield renamed(case.network, {entry.name: new}), text


def _by_rates(case: Case) -> Iterator[tuple[Network, Rate, Expression]]:
    """Yield networks with one rate times or over a number or a symbol."""
    network = case.network
    for rate, expression in rates_of(network).items():
        for changed in _variants(expression, case):
            yield with_rates(network, {rate: changed}), rate, changed


def _variants(rate: Expression, case: Case) -> Iterator[Expression]:
    exponents = {name for part in walk(rate) if isinstance(part, Function)
                 for name in symbols_of(part)}
    own = symbols_of(rate)
    entries = sorted(case.network.symbols, key=lambda entry: entry.name not in own)
    for entry in entries:
        symbol = Symbol(entry.name)
        if entry.name in exponents:
            for factor in (-2, -1, -HALF, HALF, 1, 2):
                yield multiply([rate, function("exp", multiply([number(factor), symbol]))])
        elif entry.positive:
            yield divide(rate, symbol)
            yield multiply([rate, symbol])
    for value in (2, HALF):
        yield multiply([number(value), rate])
