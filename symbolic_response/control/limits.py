"""Leading behaviour of quantities as one symbol tends to 0 or to an infinity, in the other symbols.

Works on the factored closed form: the leading term of a product is the product of the leading
terms. In a sum whose leading terms cancel the whole polynomial in the symbol is taken, never its
terms one by one; a coefficient is kept only if it does not vanish identically.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from fractions import Fraction
from math import factorial

from symbolic_response.algebra.factored import (
    ZERO,
    Base,
    Context,
    Factored,
    FactoredSum,
    constant,
    from_polynomial,
    integer_power,
    monomial_of,
    product,
    scaled,
)
from symbolic_response.algebra.simplify import logarithm_of, raised
from symbolic_response.algebra.sums import total
from symbolic_response.algebra.vanishing import polynomial_vanishes, vanishes
from symbolic_response.errors import EvaluationError, UndecidedError
from symbolic_response.expressions.normal_form import normal_form, reduce_roots
from symbolic_response.expressions.ring import (
    Generator,
    Poly,
    Polynomial,
    Ring,
    all_symbols,
    common_denominator,
    factors_of,
)
from symbolic_response.expressions.tree import Expression, Symbol, add, number
from symbolic_response.network.model import Network
from symbolic_response.network.quantity_reader import read_quantity
from symbolic_response.response.analysis import Analysis, as_analysis
from symbolic_response.response.closed_form import ClosedForm, closed_form
from symbolic_response.response.placing import exponents_of

ENDS = ("0", "inf", "-inf")


@dataclass(frozen=True, slots=True)
class Leading:
    """quantity ~ x^power * (coefficient + logarithm * ln x) as the symbol x tends to an end.

    ``exponential``: exp(power x) stands for x^power and x for ln x (a real symbol in exponents that
    tends to an infinity). ``logarithm`` is None where it is zero; where it is not, the coefficient
    may be zero. Otherwise the coefficient is zero only if the quantity is identically zero.
    """

    symbol: str
    end: str
    coefficient: ClosedForm
    power: Fraction
    logarithm: ClosedForm | None = None
    exponential: bool = False

    def limit(self) -> Expression | None:
        """Return the limit in the other symbols, None where it is infinite."""
        if self.power == 0:
            return self.coefficient.expression if self.logarithm is None else None
        grows = (self.power > 0) == (self.end == "inf")
        if self.end == "-inf" and not self.exponential:
            grows = self.power > 0
        return None if grows else number(0)


def leading(
    subject: Network | Analysis, quantity: Expression | str, symbol: str, end: str
) -> Leading:
    """Return the leading behaviour of a quantity as a symbol tends to an end, exactly.

    ``end``: ``"0"`` or ``"inf"``; for real symbols also ``"-inf"``, and ``"0"`` gives the first
    term of the power series that does not vanish: its coefficient and order. Raises QuantityError
    for an unknown symbol, EvaluationError for an end that does not fit or where no such term
    exists, UndecidedError where it was not found, SizeLimitError as closed forms do.

    >>> from symbolic_response.network.build import build_network
    >>> pair = build_network("pair", states="A B", transitions=[("A", "B", "k*c", "q")])
    >>> low = leading(pair, "p[B]", "c", "0")
    >>> low.coefficient.text(), low.power
    ('k/q', Fraction(1, 1))
    """
    analysis = as_analysis(subject)
    positive = analysis.network.symbol(symbol).positive
    if isinstance(quantity, str):
        quantity = read_quantity(quantity, analysis.network)
    if end not in ENDS or (positive and end == "-inf"):
        raise EvaluationError(f"{symbol} cannot tend to {end!r}; take '0' or 'inf'"
                              + ("" if positive else " or '-inf'"))
    form = closed_form(quantity, analysis)
    inside = any(symbol in all_symbols(part) for part in exponents_of(form.expression))
    if positive and inside:
        raise _no_term(symbol, "it is positive and occurs in an exponent")
    exponential = inside and end != "0"
    finder = _Finder(symbol, end, exponential, positive, analysis.substitution.context)
    found = finder.of(form.form)

    def closed(part: Factored) -> ClosedForm:
        return ClosedForm(part, form.names, form.positive)

    logarithm = None if found.slope.is_zero() else closed(found.slope)
    return Leading(symbol, end, closed(found.constant), found.power, logarithm, exponential)


def _no_term(symbol: str, why: str) -> EvaluationError:
    return EvaluationError(f"the quantity has no leading power of {symbol}: {why}")


@dataclass(frozen=True, slots=True)
class _Lead:
    """x^power (slope ln x + constant)."""

    power: Fraction
    constant: Factored
    slope: Factored = ZERO

    def is_zero(self) -> bool:
        return self.constant.is_zero() and self.slope.is_zero()


@dataclass(frozen=True, slots=True)
class _Finder:
    symbol: str
    end: str
    exponential: bool
    positive: bool
    context: Context

    def of(self, value: Factored) -> _Lead:
        """Return the leading term of a factored form."""
        if value.is_zero():
            return _Lead(Fraction(0), ZERO)
        leads = [_Lead(Fraction(0), constant(value.coefficient))]
        for generator, exponent in value.ring.powers(value.monomial):
            leads.append(self._generator(generator, exponent))
        for base, exponent in value.factors:
            leads.append(self._raised(self._base(base), exponent))
        result = leads[0]
        for lead in leads[1:]:
            result = self._times(result, lead)
        return result

    def _has(self, node: Expression) -> bool:
        return self.symbol in all_symbols(node)

    def _times(self, a: _Lead, b: _Lead) -> _Lead:
        if not a.slope.is_zero() and not b.slope.is_zero():
            raise _no_term(self.symbol, "a product of two logarithms of it leads")
        slope = [product([one.slope, other.constant]) for one, other in ((a, b), (b, a))
                 if not one.slope.is_zero()]
        return _Lead(a.power + b.power, product([a.constant, b.constant]), *slope)

    def _raised(self, lead: _Lead, exponent: Fraction) -> _Lead:
        if exponent == 1:
            return lead
        if not lead.slope.is_zero():
            raise _no_term(self.symbol, "a power of a logarithm of it leads")
        return _Lead(lead.power * exponent, raised(lead.constant, exponent, self.context))

    def _generator(self, generator: Generator, exponent: Fraction) -> _Lead:
        if not self._has(generator.base):
            return _Lead(Fraction(0), monomial_of(generator, exponent))
        one = constant(1)
        if generator.base == Symbol(self.symbol) and generator.kind == "exp":
            return _Lead(exponent if self.exponential else Fraction(0), one)
        if generator.base == Symbol(self.symbol) and generator.kind == "symbol":
            if not self.exponential:
                return _Lead(exponent, one)
            if exponent == 1:
                return _Lead(Fraction(0), ZERO, one)
        if generator.relation is not None:
            inner = self._base(generator.relation)
            return self._raised(inner, exponent)
        raise _no_term(self.symbol, "it occurs in a root or exponential of a sum")

    def _base(self, base: Base) -> _Lead:
        node = Factored(Fraction(1), factors=((base, Fraction(1)),))
        if not self._has(node.expression()):
            return _Lead(Fraction(0), node)
        if isinstance(base, Polynomial):
            return self._polynomial(base.poly, base.ring)
        if isinstance(base, FactoredSum):
            return self._sum(base.terms, node.expression())
        if base.name == "ln":
            return self._logarithm(base.argument)
        raise _no_term(self.symbol, "it occurs in an exponential of a quantity")

    # -- sums ------------------------------------------------------------------------------

    def _sum(self, terms: Sequence[Factored], whole: Expression) -> _Lead:
        """Return the lead of a sum: that of the leading terms unless they cancel."""
        leads = [lead for lead in map(self.of, terms) if not lead.is_zero()]
        best = self._best(lead.power for lead in leads)
        top = [lead for lead in leads if lead.power == best]
        slope = total([lead.slope for lead in top], self.context)
        rest = total([lead.constant for lead in top], self.context)
        domain = self.context.domain
        slope, rest = (ZERO if part.is_zero() or vanishes(part.expression(), domain) else part
                       for part in (slope, rest))
        if not slope.is_zero() or not rest.is_zero():
            return _Lead(best, rest, slope)
        form = normal_form(whole, domain)
        if form.is_zero():
            return _Lead(Fraction(0), ZERO)
        if any(g.kind == "ln" and self._has(g.base) for g in form.ring.generators):
            raise UndecidedError(f"the leading terms in {self.symbol} cancel, and logarithms of it"
                                 " remain; ask for the parts of the quantity")
        above = self._polynomial(form.numerator, form.ring)
        below = self._polynomial(form.denominator, form.ring)
        return self._times(above, self._raised(below, Fraction(-1)))

    def _best(self, powers: Iterable[Fraction]) -> Fraction:
        lowest = self.end == "0" or (self.end == "-inf" and self.exponential)
        return min(powers) if lowest else max(powers)

    def _logarithm(self, argument: Factored) -> _Lead:
        inner = self.of(argument)
        if not inner.slope.is_zero():
            raise _no_term(self.symbol, "a logarithm of a logarithm of it leads")
        if inner.power:
            slope = constant(inner.power)
            return _Lead(Fraction(0), logarithm_of(inner.constant, self.context), slope)
        less = add([inner.constant.expression(), number(-1)])
        if not vanishes(less, self.context.domain):
            return _Lead(Fraction(0), logarithm_of(inner.constant, self.context))
        return self.of(total([argument, constant(-1)], self.context))  # ln(1 + u) ~ u

    # -- polynomials -----------------------------------------------------------------------

    def _polynomial(self, poly: Poly, ring: Ring) -> _Lead:
        if any(g.relation is not None and root == 1 and self._has(g.base)
               for g, root in zip(ring.generators, ring.roots, strict=True)):
            ring, (poly,) = reduce_roots([poly], ring)
        places: dict[str, int] = {}
        for place, generator in enumerate(ring.generators):
            if self._has(generator.base) and poly.degrees()[place]:
                if generator.base != Symbol(self.symbol) or generator.kind not in ("symbol", "exp"):
                    raise _no_term(self.symbol, "it occurs in a root or exponential of a sum")
                places[generator.kind] = place
        if self.end == "0" and not self.positive:
            return self._series(poly, ring, places)
        main, other = places.get("symbol"), None
        if self.exponential:
            main, other = places.get("exp"), main
        groups: dict[Fraction, dict[int, dict[tuple[int, ...], Fraction]]] = {}
        for exponents, coefficient in poly.terms():
            degree = _degree(exponents, main, ring)
            logs = _degree(exponents, other, ring)
            if logs > 1:
                raise _no_term(self.symbol, "a power of it stands beside its exponentials")
            rest = tuple(0 if k in (main, other) else int(e) for k, e in enumerate(exponents))
            groups.setdefault(degree, {}).setdefault(int(logs), {})[rest] = Fraction(
                int(coefficient))
        while groups:
            best = self._best(groups)
            parts = groups.pop(best)
            lead = _Lead(best, *(self._gathered(parts.get(logs, {}), ring) for logs in (0, 1)))
            if not lead.is_zero():
                return lead
        return _Lead(Fraction(0), ZERO)

    def _series(self, poly: Poly, ring: Ring, places: Mapping[str, int]) -> _Lead:
        """Return the first term of the power series in a real symbol that does not vanish.

        x^a exp(b x) has the coefficient b^(m - a)/(m - a)! at x^m. A sum of such terms vanishes
        at 0 to an order below the number of its exponentials times the degree in x plus one.
        """
        terms = []
        for exponents, coefficient in poly.terms():
            a = int(_degree(exponents, places.get("symbol"), ring))
            b = _degree(exponents, places.get("exp"), ring)
            rest = tuple(0 if k in places.values() else int(e) for k, e in enumerate(exponents))
            terms.append((a, b, rest, int(coefficient)))
        orders = (1 + max((a for a, *_ in terms), default=0)) * len({b for _, b, *_ in terms})
        for order in range(orders):
            gathered: dict[tuple[int, ...], Fraction] = {}
            for a, b, rest, size in terms:
                if a <= order:
                    step = size * b ** (order - a) / factorial(order - a)
                    gathered[rest] = gathered.get(rest, Fraction(0)) + step
            found = self._gathered(gathered, ring)
            if not found.is_zero():
                return _Lead(Fraction(order), found)
        return _Lead(Fraction(0), ZERO)

    def _gathered(self, terms: Mapping[tuple[int, ...], Fraction], ring: Ring) -> Factored:
        """Return a coefficient as a factored polynomial in the other symbols."""
        kept = {exponents: c for exponents, c in terms.items() if c}
        scale = common_denominator(kept.values())
        poly = ring.context.from_dict({exponents: int(c * scale) for exponents, c in kept.items()})
        if polynomial_vanishes(poly, ring):
            return ZERO
        content, pieces = factors_of(poly)
        parts = [integer_power(from_polynomial(piece, ring, self.context), times)
                 for piece, times in pieces]
        return scaled(product([constant(content), *parts]), Fraction(1, scale))


def _degree(exponents: Sequence[int], place: int | None, ring: Ring) -> Fraction:
    return Fraction(0) if place is None else Fraction(int(exponents[place]), ring.roots[place])
