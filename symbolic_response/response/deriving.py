"""From a text to a result: closed form, substitutions, exact value, enclosure."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from fractions import Fraction
from math import gcd

import flint

from symbolic_response.errors import (
    AssignmentError,
    EvaluationError,
    ExpressionError,
    QuantityError,
    SizeLimitError,
)
from symbolic_response.expressions.enclosure import ball, decimal_enclosure
from symbolic_response.expressions.latex import expression_latex, fraction_latex
from symbolic_response.expressions.names import nearest
from symbolic_response.expressions.normal_form import Quotient, normal_form
from symbolic_response.expressions.reader import read_expression
from symbolic_response.expressions.ring import Domain
from symbolic_response.expressions.signs import certain_sign
from symbolic_response.expressions.text import expression_text, fraction_text
from symbolic_response.expressions.tree import (
    Expression,
    Number,
    Symbol,
    add,
    function,
    multiply,
    number,
    rebuild,
    substitute,
    symbols_of,
)
from symbolic_response.network.model import Network
from symbolic_response.network.quantities import BySymbol, Change, Response
from symbolic_response.network.quantity_reader import read_quantity
from symbolic_response.network.substitution import with_substitution
from symbolic_response.response.analysis import Analysis, as_analysis
from symbolic_response.response.closed_form import ClosedForm, closed_form
from symbolic_response.response.existence import require_existence, require_inner_existence
from symbolic_response.response.placing import placed, placed_as_it_stands
from symbolic_response.response.values import NO_SYMBOLS, Point

MAX_TIDIED = 600  # a longer irrational value is shown as it comes
RATIONAL_PRECISION, RATIONAL_DENOMINATOR = 2048, 2**900


@dataclass(frozen=True, slots=True)
class Value:
    """The exact value of a quantity: a rational number, or an expression and its enclosure.

    ``enclosure``: two decimals as text, relative width at most 1e-20; None for a rational value.
    """

    exact: Fraction | None
    expression: Expression
    enclosure: tuple[str, str] | None = None

    def __str__(self) -> str:
        return expression_text(self.expression)


@dataclass(frozen=True, slots=True)
class Derived:
    """One result: the quantity as asked for, its expression, LaTeX, and value if it has one."""

    quantity: str
    expression: str
    latex: str
    value: Value | None

    def _repr_latex_(self) -> str:
        return f"$\\displaystyle {self.latex}$"


def read_assignments(texts: Sequence[str], what: str) -> dict[str, Expression]:
    """Return ``SYMBOL=EXPRESSION`` texts as expressions by name; AssignmentError if one is bad."""
    found: dict[str, Expression] = {}
    for text in texts:
        name, equals, value = text.partition("=")
        name = name.strip()
        if not equals or not name:
            raise AssignmentError(f"{what} {text[:60]!r}: write SYMBOL=EXPRESSION")
        if name in found:
            raise AssignmentError(f"{what}: {name} is given twice")
        try:
            found[name] = read_expression(value)
        except ExpressionError as error:
            raise AssignmentError(f"{what} {text[:60]!r}: {error}") from None
    return found


def check_values(values: Mapping[str, Expression], network: Network) -> None:
    """Raise AssignmentError unless each value is a constant that its symbol may take."""
    known = [entry.name for entry in network.symbols]
    for name, value in values.items():
        if name not in known:
            raise AssignmentError(f"there is no symbol {name!r}{nearest(name, known)}")
        if others := sorted(symbols_of(value)):
            raise AssignmentError(
                f"the value of {name} contains the symbol {others[0]}; a value has none (an"
                " expression with symbols goes into a substitution)"
            )
        try:
            sign = certain_sign(value, frozenset())
        except EvaluationError as error:
            raise AssignmentError(f"the value of {name}: {error}") from None
        if network.symbol(name).positive and sign != 1:
            raise AssignmentError(f"the value of {name} is {expression_text(value)}, and {name} is"
                                  " a positive symbol")


def check_not_replaced(
    values: Mapping[str, Expression], changes: Mapping[str, Expression], network: Network
) -> None:
    """Raise AssignmentError where a symbol that a substitution has removed is given a value."""
    known = [entry.name for entry in network.symbols]
    for name in values:
        if name in changes and name not in known:
            raise AssignmentError(f"{name} has been replaced; give values to the symbols that"
                                  f" remain: {', '.join(known[:12]) or 'none'}")


Given = str | int | Fraction | Expression


def derive(
    subject: Network | Analysis,
    text: str,
    *,
    at: Mapping[str, Given] | None = None,
    put: Mapping[str, Given] | None = None,
) -> Derived:
    """Return a quantity or response of a network in closed form, or its exact value.

    ``put`` substitutes expressions for symbols first, ``at`` then gives values to symbols (``3/7``,
    ``ln(3/2)``). Pass an :class:`Analysis` to derive several quantities of one network. Raises
    QuantityError, AssignmentError, EvaluationError, SizeLimitError.

    >>> from symbolic_response.network.build import build_network
    >>> pair = build_network("pair", states="A B", transitions=[("A", "B", "k*c", "k")])
    >>> derive(pair, "d p[B] / d ln c").expression
    'c/(c + 1)**2'
    >>> derive(pair, "d p[B] / d ln c", at={"c": "1/2", "k": 3}).value.exact
    Fraction(2, 9)
    """
    analysis = as_analysis(subject)
    quantity = read_quantity(text, analysis.network)
    if put:
        changes = given(put)
        analysis = Analysis(with_substitution(analysis.network, changes))
        quantity = replaced(quantity, changes, text)
    values = given(at)
    if put:
        check_not_replaced(values, changes, analysis.network)
    return derive_quantity(analysis, quantity, text, values)


def given(values: Mapping[str, Given] | None) -> dict[str, Expression]:
    """Return values or expressions of symbols, given as text or exact numbers, as trees."""
    return {name: _given(name, value) for name, value in (values or {}).items()}


def _given(name: str, value: Given) -> Expression:
    if isinstance(value, Expression):
        return value
    if isinstance(value, str):
        return read_assignments([f"{name}={value}"], "assignment")[name]
    if isinstance(value, (int, Fraction)):
        return number(value)
    raise AssignmentError(f"the value of {name} is a {type(value).__name__}; give it as exact text")


def derive_quantity(
    analysis: Analysis, quantity: Expression, label: str, values: Mapping[str, Expression]
) -> Derived:
    """Return a quantity that has been read, with ``values`` put in for symbols.

    Where every symbol has a value, the value comes straight from the linear system and no closed
    form is needed.
    """
    check_values(values, analysis.network)
    try:
        return _derived(analysis, quantity, label, values)
    except EvaluationError as error:
        raise EvaluationError(f"{label!r}: {error}") from None
    except OverflowError:
        raise SizeLimitError(f"{label!r}: a value is too large for an exact result") from None


def _derived(
    analysis: Analysis, quantity: Expression, label: str, values: Mapping[str, Expression]
) -> Derived:
    if all(entry.name in values for entry in analysis.network.symbols):
        point = Point(analysis.network, values)
        exact = point.value(quantity)
        if exact is not None:
            return _rational(label, exact)
        constant = point.expression(quantity)
        if constant is not None:
            return _constant(label, constant, NO_SYMBOLS)
    form = closed_form(quantity, analysis)
    require_inner_existence(quantity, analysis)
    require_existence(form.expression, analysis.domain.positive)
    if values:
        check_rates(analysis.network, values)
        at = placed(form, values, analysis.domain)
        if at is None:
            return _as_it_stands(label, placed_as_it_stands(form, values), form)
        form = at
        require_existence(form.expression, analysis.domain.positive)
    if form.symbols():
        return Derived(label, form.text(), form.latex(), None)
    # in the domain of the form: its polynomials hold generators that were ranked there
    return _constant(label, form.expression, analysis.domain)


def _as_it_stands(text: str, given: Expression, form: ClosedForm) -> Derived:
    shown, latex = expression_text(given), expression_latex(given, form.names)
    if symbols_of(given):
        return Derived(text, shown, latex, None)
    return Derived(text, shown, latex, Value(None, given, decimal_enclosure(given)))


def _rational(text: str, exact: Fraction) -> Derived:
    shown = Value(exact, number(exact))
    return Derived(text, fraction_text(exact), fraction_latex(exact), shown)


def _constant(text: str, given: Expression, domain: Domain) -> Derived:
    expression = given
    if _is_short(given, domain) or may_be_rational(given):
        value = normal_form(given, domain)
        exact = value.as_fraction()
        if exact is not None:
            return _rational(text, exact)
        forms = [value.expression(), given, gathered_logarithm(value)]
        expression = min((form for form in forms if form is not None),
                         key=lambda form: len(expression_text(form)))
    shown = Value(None, expression, decimal_enclosure(expression))
    return Derived(text, expression_text(expression), expression_latex(expression, {}), shown)


def gathered_logarithm(value: Quotient) -> Expression | None:
    """Return ``(358*ln(2) + 179*ln(5))/398`` as ``179*ln(20)/398``, None for other constants."""
    if not value.denominator.is_constant():
        return None
    below = int(value.denominator.leading_coefficient())
    rest, weights = Fraction(0), []
    for exponents, coefficient in value.numerator.terms():
        powers = value.ring.powers(exponents)
        if not powers:
            rest = Fraction(int(coefficient), below)
            continue
        (generator, exponent), *others = powers
        if others or exponent != 1 or generator.kind != "ln" or not isinstance(
            generator.base, Number
        ):
            return None
        weights.append((generator.base.value, int(coefficient)))
    common = gcd(*(weight for _, weight in weights))
    if not common or sum(abs(w) // common * b.numerator.bit_length() for b, w in weights) > 64:
        return None
    argument = Fraction(1)
    for base, weight in weights:
        argument *= base ** (weight // common)
    sign = 1 if argument > 1 else -1
    factor = number(Fraction(sign * common, below))
    return add([number(rest), multiply([factor, function("ln", number(argument**sign))])])


def _is_short(constant: Expression, domain: Domain) -> bool:
    """Return whether its normal form is found quickly: numbers and their logarithms, or little."""
    return not domain.names or len(expression_text(constant)) <= MAX_TIDIED


def may_be_rational(constant: Expression) -> bool:
    """Return False if a constant is certainly no fraction with a denominator below 2^900.

    A fraction inside an enclosure is no closer to its middle than the best approximation.
    """
    with flint.ctx.workprec(RATIONAL_PRECISION):
        enclosure = ball(constant)
    if not enclosure.is_finite():
        return True
    middle, radius = (arb_fraction(end) for end in (enclosure.mid(), enclosure.rad()))
    nearest_one = middle.limit_denominator(RATIONAL_DENOMINATOR)
    return abs(nearest_one - middle) <= radius


def arb_fraction(exact: flint.arb) -> Fraction:
    """Return an exact ball as a fraction."""
    mantissa, exponent = exact.man_exp()
    return Fraction(int(mantissa)) * Fraction(2) ** int(exponent)


def check_rates(network: Network, values: Mapping[str, Expression]) -> None:
    """Raise EvaluationError if, with some symbols given values, a rate cannot be positive."""
    placed = dict(values)
    for transition in network.transitions:
        for rate in (transition.forward, transition.backward):
            if rate is None:
                continue
            sign = certain_sign(substitute(rate, placed), network.positive_symbols)
            if sign is not None and sign <= 0:
                at = ", ".join(f"{name} = {expression_text(v)}" for name, v in placed.items())
                raise EvaluationError(
                    f"rate {expression_text(rate)!r} of transition {transition.name!r} is not"
                    f" positive at {at}"
                )


def replaced(quantity: Expression, changes: Mapping[str, Expression], label: str) -> Expression:
    """Return a quantity with symbols replaced; QuantityError for a response to one of them."""

    def leaf(part: Expression) -> Expression:
        if isinstance(part, Response):
            by = part.perturbation
            if isinstance(by, BySymbol) and by.name in changes:
                raise QuantityError(
                    f"{label!r} is a response to {by.name}, which a substitution replaces"
                )
            return Response(rebuild(part.quantity, leaf), by)
        if isinstance(part, Change):
            inner, amount = rebuild(part.quantity, leaf), substitute(part.amount, dict(changes))
            return Change(inner, part.transition, amount)
        return changes.get(part.name, part) if isinstance(part, Symbol) else part

    return rebuild(quantity, leaf)
