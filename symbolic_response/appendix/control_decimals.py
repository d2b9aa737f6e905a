"""Numbers of a text: exact where short, else the decimals that an enclosure settles."""

from __future__ import annotations

from collections.abc import Mapping
from decimal import ROUND_HALF_EVEN, Context, Decimal
from fractions import Fraction

from symbolic_response.appendix.paper import Paper
from symbolic_response.expressions.latex import fraction_latex
from symbolic_response.expressions.tree import Expression

DIGITS = 6
MOST_EXACT = 10_000
_PLAIN_FROM, _PLAIN_TO = -4, 6


def value_latex(enclosure: tuple[str, str], exact: Fraction | None = None) -> str:
    r"""Return ``= 3/4`` for a short exact number, else ``\approx`` and rounded decimals.

    >>> value_latex(("0.333333333333333333333", "0.333333333333333333334"), Fraction(1, 3))
    '= 1/3'
    >>> value_latex(("12345678.9012", "12345678.9013"))
    '\\approx 1.23457 \\times 10^{7}'
    """
    if exact is not None and abs(exact.numerator) < MOST_EXACT and exact.denominator < MOST_EXACT:
        return f"= {exact}"
    low, high = (Decimal(text) for text in enclosure)
    if low == high == low.normalize(Context(prec=DIGITS)):
        return f"= {_decimal_latex(low)}"
    return rf"\approx {_decimal_latex(rounded(low, high))}"


def rounded(low: Decimal, high: Decimal) -> Decimal:
    """Return the number that both ends round to, in the most digits, six at the most.

    >>> rounded(Decimal("1.99996"), Decimal("2.00003"))
    Decimal('2.0000')
    """
    for digits in range(DIGITS, 0, -1):
        context = Context(prec=digits, rounding=ROUND_HALF_EVEN)
        ends = context.plus(low), context.plus(high)
        if ends[0] == ends[1]:
            return min(ends, key=lambda end: len(end.as_tuple().digits))
    return Context(prec=1).plus(low)


def _decimal_latex(value: Decimal) -> str:
    if value == 0 or _PLAIN_FROM <= value.adjusted() < _PLAIN_TO:
        return f"{value:f}"
    digits, exponent = f"{value:E}".split("E")
    return rf"{digits} \times 10^{{{int(exponent)}}}"


def values_text(paper: Paper, values: Mapping[str, Expression]) -> str:
    """Return the values of symbols, as formulas between which a line may end."""
    names = paper.notation.symbols
    shown = [f"${names[s.name]} = {paper.latex(values[s.name])}$"
             for s in paper.network.symbols if s.name in values]
    return shown[0] if len(shown) == 1 else f"{', '.join(shown[:-1])} and {shown[-1]}"


def exact_latex(value: Fraction) -> str:
    """Return an exact number, as a decimal where it is long."""
    if abs(value.numerator) < MOST_EXACT and value.denominator < MOST_EXACT:
        return fraction_latex(value)
    context = Context(prec=DIGITS)
    return _decimal_latex(context.divide(Decimal(value.numerator), Decimal(value.denominator)))


def value_words(enclosure: tuple[str, str], exact: Fraction | None = None) -> str:
    """Return a number within a sentence: ``$3/4$``, or ``about $0.41$``."""
    shown = value_latex(enclosure, exact)
    if shown.startswith("="):
        return f"${shown.removeprefix('= ')}$"
    return "about $" + shown.removeprefix(r"\approx ") + "$"
