"""Long sums by name: tree sums, normalisation, numerators of currents, forest differences.

Every named sum is kept as it is printed: in the user's symbols, the factor common to all tree sums
divided out. A result in factored form is rewritten with the names of the sums that occur in it.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass
from fractions import Fraction
from math import gcd, lcm

from symbolic_response.algebra.factored import (
    Base,
    Factored,
    FactoredFunction,
    FactoredSum,
    constant,
    integer_power,
    monomial_of,
    product,
    scaled,
    trimmed,
)
from symbolic_response.algebra.simplify import simplify
from symbolic_response.algebra.sums import total
from symbolic_response.expressions.ring import (
    Generator,
    Poly,
    Polynomial,
    lift,
    lift_exponents,
    union,
)
from symbolic_response.expressions.tree import (
    Expression,
    Function,
    Number,
    Power,
    Symbol,
    add,
    function,
    walk,
)
from symbolic_response.response.analysis import Analysis, AnalysisInRates
from symbolic_response.response.notation import Notation

SHORT_TERMS = 4


@dataclass(frozen=True, slots=True)
class NamedSum:
    """A sum with a name; ``kind`` and ``place`` say which, ``form`` is what it stands for."""

    kind: str
    place: tuple[int, ...]
    latex: str
    form: Factored

    @property
    def key(self) -> str:
        """The name of the symbol that stands for the sum in expression trees."""
        return f"#{self.kind}{list(self.place)}"

    @property
    def terms(self) -> int:
        """The number of terms of the sum."""
        return sum(_length(base) for base, _ in self.form.factors) or 1

    def symbol(self) -> Factored:
        """Return the name as a factor."""
        return monomial_of(self.generator(), Fraction(1))

    def generator(self) -> Generator:
        """Return the generator that stands for the sum."""
        order = (_KINDS.index(self.kind), *self.place, 0, 0)
        rank = 10**9 * (order[0] + 1) + 10**4 * order[1] + order[2]
        return Generator("symbol", rank, self.key, Symbol(self.key), self.kind in _POSITIVE)


_KINDS = (
    "current", "traffic", "tree", "forest", "mean forest", "remainder", "force", "total"
)
_POSITIVE = ("tree", "total", "traffic")


def _length(base: Base) -> int:
    match base:
        case Polynomial():
            return len(base.poly)
        case FactoredSum(terms):
            return len(terms)
    return 1


class NamedSums:
    """The named sums of one network in one notation, each made at its first use."""

    def __init__(self, analysis: Analysis, notation: Notation) -> None:
        self.analysis = analysis
        self.notation = notation
        self.common = _common_factor(analysis)
        self._made: dict[tuple[str, tuple[int, ...]], NamedSum] = {}
        self._by_poly: dict[Polynomial, NamedSum] = {}
        self._by_base: dict[Base, NamedSum] = {}
        self.by_key: dict[str, NamedSum] = {}
        self._remainders: dict[Base, NamedSum] = {}
        for k in range(analysis.graph.size):
            self.tree(k)
        self.total()

    def names(self) -> dict[str, str]:
        """Return the LaTeX of all symbols, those of the file and those that stand for sums."""
        return dict(self.notation.symbols) | {key: s.latex for key, s in self.by_key.items()}

    def used_in(self, node: Iterable[str]) -> list[NamedSum]:
        """Return the named sums among symbol names, in canonical order."""
        found = [self.by_key[name] for name in node if name in self.by_key]
        return sorted(found, key=lambda s: (_KINDS.index(s.kind), s.place))

    # -- the sums ----------------------------------------------------------------------------

    def tree(self, state: int) -> NamedSum:
        """Return N_k."""
        latex = self.notation.indexed("tree sum", self.notation.states[state])
        return self._make("tree", (state,), latex, lambda: self.analysis.tree_sum(state))

    def total(self) -> NamedSum:
        """Return D."""
        latex = self.notation.letters["normalisation"]
        return self._make("total", (), latex, lambda: self.analysis.normalisation)

    def current(self, e: int) -> NamedSum:
        """Return C_e."""
        latex = self.notation.indexed("current numerator", self.notation.transitions[e])
        return self._make("current", (e,), latex, lambda: self.analysis.current_numerator(e))

    def traffic(self, e: int) -> NamedSum:
        """Return T_e."""
        latex = self.notation.indexed("traffic numerator", self.notation.transitions[e])
        return self._make("traffic", (e,), latex, lambda: self.analysis.traffic_numerator(e))

    def forest(self, state: int, e: int) -> NamedSum:
        """Return Phi_{k,e}."""
        labels = f"{self.notation.states[state]},{self.notation.transitions[e]}"
        latex = self.notation.indexed("forest", labels)
        make = self.analysis.forest_difference
        return self._make("forest", (state, e), latex, lambda: make(state, e))

    def mean_forest(self, observable: int, e: int) -> NamedSum | None:
        """Return the sum over states of Q_k Phi_{k,e}; None unless the values are numbers."""
        values = self.analysis.network.observables[observable].values
        numbers = [value.value for value in values if isinstance(value, Number)]
        if len(numbers) < len(values):
            return None
        scale = lcm(*(value.denominator for value in numbers))
        poly = self.analysis.rates.ring.constant(0)
        for k, value in enumerate(numbers):
            if value:
                poly = poly + self.analysis.forest_difference(k, e) * int(value * scale)
        labels = f"{self.notation.observables[observable]},{self.notation.transitions[e]}"
        latex = self.notation.indexed("forest", labels)
        found = self._make("mean forest", (observable, e), latex, lambda: poly, scale)
        return found

    def remainder(self, base: Base) -> NamedSum:
        """Return the name of a sum, a fresh one if it has none."""
        if base in self._remainders:
            return self._remainders[base]
        place = 1 + len(self._remainders)
        latex = self.notation.indexed("remainder", str(place))
        named = NamedSum("remainder", (place,), latex,
                         Factored(Fraction(1), factors=((base, Fraction(1)),)))
        self._remainders[base] = named
        return self._note(named)

    def force(self, cycle: int, form: Factored, reverse: Factored) -> NamedSum:
        """Name the force of the cycle with this number; ``reverse`` is minus ``form``."""
        latex = self.notation.indexed("force", str(cycle))
        self._note(NamedSum("force", (cycle,), latex, scaled(reverse, Fraction(-1))))
        return self._note(NamedSum("force", (cycle,), latex, form))

    def _make(
        self, kind: str, place: tuple[int, ...], latex: str, poly: Callable[[], Poly],
        scale: int = 1,
    ) -> NamedSum:
        if (kind, place) not in self._made:
            made = poly()
            ring = self.analysis.rates.ring
            image = self.analysis.simplified(Polynomial(ring, made)) if len(made) else constant(0)
            parts = [image, integer_power(self.common, -1), constant(Fraction(1, scale))]
            named = self._note(NamedSum(kind, place, latex, product(parts)))
            if len(made) and Polynomial(ring, made) not in self._by_poly:
                self._by_poly[Polynomial(ring, made)] = named
        return self._made[(kind, place)]

    def _note(self, named: NamedSum) -> NamedSum:
        self._made[(named.kind, named.place)] = named
        self.by_key[named.key] = named
        if len(named.form.factors) == 1:
            ((base, exponent),) = named.form.factors
            if exponent == 1:
                self._by_base.setdefault(base, named)
        return named

    # -- results in terms of them ----------------------------------------------------------

    def recognised(self, form: Factored, defined: Iterable[str]) -> Factored:
        """Return a form with the sums that have a name written by name.

        Short forest sums are left as they are unless their key is among ``defined``.
        """
        known = frozenset(defined)
        parts = [Factored(form.coefficient, form.ring, form.monomial)]
        for base, exponent in form.factors:
            named = self._by_base.get(base)
            if named is not None and exponent.denominator == 1 and self._worth(named, known):
                rest = Factored(named.form.coefficient, named.form.ring, named.form.monomial)
                quotient = product([named.symbol(), integer_power(rest, -1)])
                parts.append(integer_power(quotient, int(exponent)))
                continue
            if isinstance(base, FactoredSum) and exponent.denominator == 1:
                inner = [self.recognised(term, known) for term in base.terms]
                gathered = cleared(total(inner, self.analysis.substitution.context))
                parts.append(integer_power(gathered, int(exponent)))
                continue
            parts.append(Factored(Fraction(1), factors=((self._inside(base, known), exponent),)))
        return product(parts)

    def _worth(self, named: NamedSum, defined: frozenset[str]) -> bool:
        return (
            named.kind in ("tree", "total", "current", "remainder", "force")
            or named.key in defined
            or named.terms > SHORT_TERMS
        )

    def _inside(self, base: Base, defined: frozenset[str]) -> Base:
        match base:
            case FactoredSum(terms):
                return FactoredSum(tuple(self.recognised(term, defined) for term in terms))
            case FactoredFunction(name, argument):
                return FactoredFunction(name, self.recognised(argument, defined))
        return base

    def by_names(self, tree: Expression) -> Factored | None:
        """Return a tree over polynomials in the rates with named polynomials kept as names.

        None where a sum stands inside a function or a root.
        """
        for node in walk(tree):
            opaque = isinstance(node, Function) or (
                isinstance(node, Power) and node.exponent.denominator > 1
            )
            if opaque and any(isinstance(part, Polynomial) for part in walk(node)):
                return None
        return simplify(tree, self.analysis.substitution.context, self._leaf)

    def _leaf(self, leaf: Polynomial) -> Factored:
        content = int(leaf.poly.primitive()[0])
        for factor in (1, -1, content, -content):
            named = self._by_poly.get(Polynomial(leaf.ring, leaf.poly // factor))
            if named is not None:
                scale = Fraction(factor)
                if named.kind == "mean forest":
                    scale *= self._scale(named)
                if named.form.is_zero():
                    return constant(0)
                return product([self.common, named.symbol(), constant(scale)])
        return self.analysis.simplified(leaf)

    def _scale(self, named: NamedSum) -> int:
        values = self.analysis.network.observables[named.place[0]].values
        return lcm(*(v.value.denominator for v in values if isinstance(v, Number)))


def cleared(form: Factored) -> Factored:
    """Return a form with the rational content of its sums in front of them."""
    parts = [Factored(form.coefficient, form.ring, form.monomial)]
    for base, exponent in form.factors:
        if isinstance(base, FactoredSum) and exponent.denominator == 1:
            content = _content([term.coefficient for term in base.terms])
            terms = tuple(scaled(term, 1 / content) for term in base.terms)
            parts.append(Factored(content ** int(exponent),
                                  factors=((FactoredSum(terms), exponent),)))
        else:
            parts.append(Factored(Fraction(1), factors=((base, exponent),)))
    return product(parts)


def _content(values: Sequence[Fraction]) -> Fraction:
    return Fraction(
        gcd(*(value.numerator for value in values)), lcm(*(value.denominator for value in values))
    )


def _common_factor(analysis: Analysis) -> Factored:
    """Return the product of numbers and powers that all tree sums share.

    For exponentials only a factor that every term shows counts; a network in energy form all
    through has e to the sum of all energies taken out, which leaves e^-E_k in N_k.
    """
    ring_of_rates = analysis.rates.ring
    start = constant(1)
    network = analysis.network
    if not isinstance(analysis, AnalysisInRates) and all(
        t.barrier is not None for t in network.transitions
    ):
        energies = [s.energy for s in network.states if s.energy is not None]
        start = analysis.simplified(function("exp", add(energies)))
        if start.factors:
            start = constant(1)
    images = [
        product([integer_power(start, -1),
                 analysis.simplified(Polynomial(ring_of_rates, analysis.tree_sum(k)))])
        for k in range(analysis.graph.size)
    ]
    ring = union(image.ring for image in images)
    ring = union([ring, *(b.ring for i in images for b, _ in i.factors
                          if isinstance(b, Polynomial))])
    lows, highs = [], []
    for image in images:
        low = lift_exponents(image.monomial, image.ring, ring)
        high = list(low)
        for base, _ in image.factors:
            if isinstance(base, Polynomial):
                degrees = lift(base.poly, base.ring, ring).degrees()
                high = [a + int(b) for a, b in zip(high, degrees, strict=True)]
        lows.append(low)
        highs.append(high)
    monomial = []
    for place, generator in enumerate(ring.generators):
        least, most = min(row[place] for row in lows), max(row[place] for row in highs)
        monomial.append(least if generator.kind != "exp" or least > 0 else min(most, 0))
    content = _content([image.coefficient for image in images])
    return product([start, trimmed(Factored(content, ring, tuple(monomial)))])
