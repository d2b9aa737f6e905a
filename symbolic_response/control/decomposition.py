"""A change of the rates as a sum of pieces, each with a limit on what it does to ln(p_i/p_j)."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping, Sequence
from dataclasses import dataclass
from fractions import Fraction

from symbolic_response.bounds.sides import perturbation_text, quantity_text
from symbolic_response.bounds.target import extreme, size_of
from symbolic_response.control.changes import Change, Vector
from symbolic_response.control.family import Family
from symbolic_response.control.fewest import fewest_amounts
from symbolic_response.control.program import Amounts, optimum
from symbolic_response.control.separations import Part
from symbolic_response.errors import QuantityError
from symbolic_response.expressions.normal_form import normal_form
from symbolic_response.expressions.tree import (
    ONE,
    ZERO,
    Expression,
    Number,
    add,
    multiply,
    negate,
    number,
)
from symbolic_response.network.model import Network
from symbolic_response.network.quantities import Perturbation
from symbolic_response.response.analysis import Analysis
from symbolic_response.response.closed_trees import rate_changes
from symbolic_response.topology.tree_weights import tree_weights


@dataclass(frozen=True, slots=True)
class Piece:
    """An amount of one bundle, block or drive (transitions), or of one set of rates (places)."""

    members: Part
    amount: Expression


@dataclass(frozen=True, slots=True)
class Decomposition:
    """d ln W/d x of every rate as a sum of pieces; amounts are numbers or expressions of symbols.

    ``energies``: one for each state; ``bundles`` and ``blocks``: all rates of some transitions;
    ``drives``: half of it forward, minus half of it backward; ``directed``: some rates.
    """

    energies: tuple[Expression, ...]
    bundles: tuple[Piece, ...] = ()
    blocks: tuple[Piece, ...] = ()
    drives: tuple[Piece, ...] = ()
    directed: tuple[Piece, ...] = ()

    @property
    def count(self) -> int:
        """The number of pieces; each energy that is not 0 counts as one."""
        energies = sum(energy != ZERO for energy in self.energies)
        parts = (self.bundles, self.blocks, self.drives, self.directed)
        return energies + sum(map(len, parts))

    def data(self, network: Network) -> dict[str, object]:
        """Return the pieces in the words of the file, blocks among the bundles."""
        def shown(amount: Expression) -> str:
            return quantity_text(amount, network)

        names = [t.name for t in network.transitions]
        rates = [f"{side}[{t.name}]" for t in network.transitions
                 for side in (("forward",) if t.backward is None else ("forward", "backward"))]
        return {
            "energies": {state.name: shown(energy) for state, energy
                         in zip(network.states, self.energies, strict=True) if energy != ZERO},
            "bundles": [{"transitions": [names[e] for e in piece.members],
                         "amount": shown(piece.amount)}
                        for piece in (*self.bundles, *self.blocks)],
            "drives": {names[piece.members[0]]: shown(piece.amount) for piece in self.drives},
            "directed": [{"rates": [rates[r] for r in piece.members],
                          "amount": shown(piece.amount)} for piece in self.directed],
        }


@dataclass(frozen=True, slots=True)
class LinearForm:
    """``constant`` + sum of ``slopes`` * tanh(F/4), F the force of a bundle; limits the response.

    |d ln(p_i/p_j)/d x| is at most this for all forces, as ``decomposition`` shows.
    """

    constant: Expression
    slopes: tuple[tuple[Part, Expression], ...]
    decomposition: Decomposition

    def numbers(self) -> tuple[Fraction, dict[Part, Fraction]] | None:
        """Return the constant and the slopes, None where they are not all numbers."""
        found: list[Fraction] = []
        for part in (self.constant, *(slope for _, slope in self.slopes)):
            if not isinstance(part, Number):
                return None
            found.append(part.value)
        return found[0], dict(zip((part for part, _ in self.slopes), found[1:], strict=True))

    def text(self, network: Network, same: Mapping[Part, Part] | None = None) -> str:
        """Return the form with t[...] for tanh(F/4) of a bundle.

        ``same``: for each bundle the one that stands for it, both having the same cycles.
        """
        terms = [quantity_text(self.constant, network)] if self.constant != ZERO else []
        slopes: dict[Part, list[Expression]] = {}
        for part, slope in self.slopes:
            slopes.setdefault(same[part] if same else part, []).append(slope)
        for part, slope in ((part, add(found)) for part, found in slopes.items()):
            name = f"t[{', '.join(network.transitions[e].name for e in part)}]"
            factor = quantity_text(slope, network)
            factor = f"({factor})" if any(sign in factor for sign in " +/") else factor
            terms.append(name if slope == ONE else f"{factor}*{name}")
        return " + ".join(terms) or "0"


def linear_form(decomposition: Decomposition, analysis: Analysis) -> LinearForm:
    """Return the limit on the response of ln(p_i/p_j) that a decomposition gives.

    max a - min a of the energies, |b| tanh(F/4) for a bundle, |f| for a drive (one-way |f|/2), for
    a set of rates |c| times the range of how many of them a tree towards any state uses.
    """
    positive = analysis.domain.positive

    def size(amount: Expression, factor: Fraction = Fraction(1)) -> Expression:
        return multiply([number(factor), size_of(amount, positive)])

    fixed = [extreme("max", decomposition.energies),
             negate(extreme("min", decomposition.energies))]
    for piece in decomposition.drives:
        half = Fraction(1, 2) if analysis.graph.one_way[piece.members[0]] else Fraction(1)
        fixed.append(size(piece.amount, half))
    fixed += [size(piece.amount, Fraction(_uses(piece.members, analysis)))
              for piece in decomposition.directed]
    return LinearForm(
        add(fixed), tuple((piece.members, size(piece.amount)) for piece in decomposition.bundles),
        decomposition)


def _uses(places: Part, analysis: Analysis) -> int:
    """Return the range of how many of some rates a tree uses; out of one state one or none."""
    rates = [analysis.rates.directions()[r] for r in places]
    if len({analysis.graph.ends[e][1 if backward else 0] for e, backward in rates}) == 1:
        return 1
    least, most = tree_weights(analysis.graph, dict.fromkeys(rates, 1))
    return most - least


# -- made by linear programs -----------------------------------------------------------------------


def tightest(
    analysis: Analysis, change: Change, family: Family, t: Sequence[Fraction]
) -> Decomposition:
    """Return the pieces with the least limit at given t, one for each bundle of the family.

    Exactly least where the change is made of numbers; else the numbers and each vector beside an
    expression by itself.
    """
    return _made(analysis, change, family, lambda vector: optimum(family, vector, t).amounts)


def sparsest(analysis: Analysis, change: Change, family: Family) -> Decomposition:
    """Return the fewest pieces where three or less suffice, else few, see ``fewest_amounts``.

    The numbers, and each vector beside an expression, by themselves.
    """
    return _made(analysis, change, family, lambda vector: fewest_amounts(family, vector))


def combined(
    analysis: Analysis, change: Change, family: Family, amounts: Sequence[Amounts]
) -> Decomposition:
    """Return the decomposition with given amounts for the numbers and for each other vector.

    That it sums to the change of every rate is checked symbolically.
    """
    factors = (ONE, *(expression for expression, _ in change.parts))
    made = assembled(analysis, family, list(zip(factors, amounts, strict=True)))
    check_sum(made, analysis, change.by)
    return made


def assembled(
    analysis: Analysis, family: Family, pairs: Sequence[tuple[Expression, Amounts]]
) -> Decomposition:
    """Return the sum of factors times amounts as a decomposition."""

    def gathered(found: Iterable[tuple[Part, Expression]]) -> tuple[Piece, ...]:
        terms: dict[Part, list[Expression]] = {}
        for members, amount in found:
            terms.setdefault(members, []).append(amount)
        pieces = (Piece(members, analysis.tidy(add(parts))) for members, parts in terms.items())
        return tuple(piece for piece in pieces if piece.amount != ZERO)

    def scaled(kind: Callable[[Amounts], Iterable[tuple[Part, Fraction]]]) -> tuple[Piece, ...]:
        return gathered((members, multiply([number(value), factor]))
                        for factor, own in pairs for members, value in kind(own) if value)

    energies = tuple(
        analysis.tidy(add([multiply([number(own.energies[j]), factor]) for factor, own in pairs]))
        for j in range(family.size))
    return Decomposition(
        energies,
        scaled(lambda own: zip(family.bundles, own.bundles, strict=True)),
        scaled(lambda own: zip(family.blocks, own.blocks, strict=True)),
        scaled(lambda own: zip(((e,) for e in family.drives), own.drives, strict=True)),
        scaled(lambda own: _nested(family, own.directed)))


def _made(
    analysis: Analysis, change: Change, family: Family, amounts: Callable[[Vector], Amounts]
) -> Decomposition:
    vectors = (change.numbers, *(u for _, u in change.parts))
    return combined(analysis, change, family, [amounts(vector) for vector in vectors])


def _nested(family: Family, directed: Vector) -> Iterable[tuple[Part, Fraction]]:
    """Return sets of rates out of one state, with amounts, that add up to given numbers.

    Of the positive numbers the rates with at least each value, of the negative ones likewise.
    """
    for j in range(family.size):
        own = [r for r, k in enumerate(family.sources) if k == j]
        for sign in (1, -1):
            before = Fraction(0)
            for level in sorted({sign * directed[r] for r in own if sign * directed[r] > 0}):
                members = tuple(r for r in own if sign * directed[r] >= level)
                yield members, sign * (level - before)
                before = level


# -- the sum ---------------------------------------------------------------------------------------


def piece_sums(decomposition: Decomposition, analysis: Analysis) -> tuple[Expression, ...]:
    """Return the sum of all pieces for each rate, by place."""
    terms: list[list[Expression]] = []
    for place, (e, backward) in enumerate(analysis.rates.directions()):
        half = number(Fraction(-1 if backward else 1, 2))
        source = analysis.graph.ends[e][1 if backward else 0]
        terms.append([
            decomposition.energies[source],
            *(p.amount for p in (*decomposition.bundles, *decomposition.blocks) if e in p.members),
            *(multiply([half, p.amount]) for p in decomposition.drives if e in p.members),
            *(p.amount for p in decomposition.directed if place in p.members),
        ])
    return tuple(map(add, terms))


def check_sum(decomposition: Decomposition, analysis: Analysis, by: Perturbation) -> None:
    """Check that the pieces sum to d ln W/d x of every rate, identically in all symbols.

    Raises QuantityError that names the first rate for which that does not follow.
    """
    changes: Mapping[int, Expression] = rate_changes(by, analysis)
    network = analysis.network
    for place, given in enumerate(piece_sums(decomposition, analysis)):
        wanted = changes.get(place, ZERO)
        difference = add([given, negate(wanted)])
        if difference == ZERO or normal_form(difference, analysis.domain).is_zero():
            continue
        e, backward = analysis.rates.directions()[place]
        rate = f"{'backward' if backward else 'forward'}[{network.transitions[e].name}]"
        parts = [quantity_text(analysis.tidy(side), network) for side in (given, wanted)]
        raise QuantityError(
            f"the pieces do not sum to d ln({rate}) / d {perturbation_text(by, network)}: they give"
            f" {parts[0]}, it is {parts[1]}")
