"""Quantities and their responses as expression trees over polynomials in the rates.

Exact forms, with notation as in :mod:`symbolic_response.response.analysis`:

- p(U) = N(U)/D, J_e = C_e/D, tau_e = T_e/D, entropy production = sum over fundamental cycles of
  the current through the chord times the cycle force (Schnakenberg 1976);
- d p(U)/d energy[j] = N_j (N(U) - [j in U] D)/D^2;
- d p(U)/d theta = sum over e of (l+ w+ N_m - l- w- N_n) Phi_{U,e} / D^2 with l+- the derivatives
  of the logarithms of e's rates (item by item: a barrier has l+ = l- = -1, a drive 1/2 and -1/2).
"""

from __future__ import annotations

from fractions import Fraction

from symbolic_response.algebra.rates import logarithmic_derivative
from symbolic_response.errors import QuantityError
from symbolic_response.expressions.derivative import by_symbol, derivative
from symbolic_response.expressions.ring import Poly, Polynomial, common_denominator
from symbolic_response.expressions.tree import (
    ONE,
    ZERO,
    Expression,
    Number,
    Symbol,
    add,
    divide,
    function,
    multiply,
    negate,
    number,
    power,
    rebuild,
    symbols_of,
)
from symbolic_response.network.quantities import (
    BarrierOf,
    BarriersOf,
    BySymbol,
    Change,
    Current,
    DirectedRate,
    DriveOf,
    EnergyOf,
    EntropyProduction,
    Mean,
    Perturbation,
    Probability,
    Response,
    Traffic,
)
from symbolic_response.response.analysis import Analysis
from symbolic_response.topology import Cycle

RateChanges = dict[int, Expression]
"""The derivative of ln of each directed rate that a perturbation changes, by place in the ring."""


def closed_tree(quantity: Expression, analysis: Analysis) -> Expression:
    """Return a quantity as a tree of symbols and polynomials in the rates."""
    return rebuild(quantity, lambda leaf: _closed_leaf(leaf, analysis))


def _closed_leaf(leaf: Expression, analysis: Analysis) -> Expression:
    match leaf:
        case Probability(states):
            return _over_total(analysis.tree_sum_of(states), analysis)
        case Mean(place):
            values = analysis.network.observables[place].values
            return divide(_weighted(values, analysis), _poly(analysis.normalisation, analysis))
        case Current(e):
            return _over_total(analysis.current_numerator(e), analysis)
        case Traffic(e):
            return _over_total(analysis.traffic_numerator(e), analysis)
        case DirectedRate(e, backward):
            return _poly(analysis.rates.generator(e, backward), analysis)
        case EntropyProduction():
            return _entropy_production(analysis)
        case Response(inner, perturbation):
            return respond(inner, perturbation, analysis)
        case Change(inner, e, amount):
            return _change(closed_tree(inner, analysis), e, amount, analysis)
    return leaf


def _change(before: Expression, e: int, amount: Expression, analysis: Analysis) -> Expression:
    """Return a closed tree after raising the barrier of e, minus the tree itself.

    A term of degree d in the rates of e is multiplied by exp(-d amount).
    """
    rates, ring = analysis.rates, analysis.rates.ring
    own = [place for place in (rates.forward[e], rates.backward[e]) if place is not None]

    def leaf(part: Expression) -> Expression:
        if not isinstance(part, Polynomial):
            return part
        by_degree: dict[int, dict[tuple[int, ...], int]] = {}
        for exponents, coefficient in part.poly.to_dict().items():
            key = tuple(int(x) for x in exponents)
            by_degree.setdefault(sum(key[place] for place in own), {})[key] = int(coefficient)
        return add([
            multiply([function("exp", multiply([number(-degree), amount])),
                      _poly(ring.context.from_dict(terms), analysis)])
            for degree, terms in by_degree.items()
        ])

    return add([rebuild(before, leaf), negate(before)])


def _poly(poly: Poly, analysis: Analysis) -> Expression:
    return Polynomial(analysis.rates.ring, poly) if len(poly) else ZERO


def _over_total(poly: Poly, analysis: Analysis) -> Expression:
    return divide(_poly(poly, analysis), _poly(analysis.normalisation, analysis))


def _weighted(values: tuple[Expression, ...], analysis: Analysis) -> Expression:
    """Return the sum of value times N_k; numeric values give a single polynomial."""
    return _combination(values, [analysis.tree_sum(k) for k in range(len(values))], analysis)


def _combination(
    values: tuple[Expression, ...], polys: list[Poly], analysis: Analysis
) -> Expression:
    numeric = [(v.value, p) for v, p in zip(values, polys, strict=True) if isinstance(v, Number)]
    scale = common_denominator(value for value, _ in numeric)
    total = analysis.rates.ring.constant(0)
    for value, poly in numeric:
        total = total + poly * int(value * scale)
    grouped: dict[Expression, Poly] = {}
    for value_, poly in zip(values, polys, strict=True):
        if not isinstance(value_, Number):
            grouped[value_] = grouped[value_] + poly if value_ in grouped else poly
    symbolic = [multiply([value_, _poly(poly, analysis)]) for value_, poly in grouped.items()]
    return add([multiply([number(Fraction(1, scale)), _poly(total, analysis)]), *symbolic])


def cycle_force(cycle: Cycle, analysis: Analysis) -> Expression:
    """Return ln(product of rates along / product against) in the user's symbols.

    Raises QuantityError, naming the transition, where a one-way step makes it infinite.
    """
    along, against = [], []
    for e, ahead in zip(cycle.transitions, cycle.along, strict=True):
        if analysis.graph.one_way[e]:
            name = analysis.network.transitions[e].name
            raise QuantityError(f"a cycle force is infinite: transition {name!r} is one-way")
        along.append(analysis.rate_expression(e, not ahead))
        against.append(analysis.rate_expression(e, ahead))
    return function("ln", divide(multiply(along), multiply(against)))


def _force_in_rates(cycle: Cycle, analysis: Analysis) -> Expression:
    """Return the force of a cycle over the ring of rates, so that perturbations reach it."""
    along = against = analysis.rates.ring.constant(1)
    for e, ahead in zip(cycle.transitions, cycle.along, strict=True):
        along = along * analysis.rates.generator(e, not ahead)
        against = against * analysis.rates.generator(e, ahead)
    return function("ln", divide(_poly(along, analysis), _poly(against, analysis)))


def _entropy_production(analysis: Analysis) -> Expression:
    terms = [
        multiply([_poly(analysis.current_numerator(c.transitions[0]), analysis),
                  _force_in_rates(c, analysis)])
        for c in analysis.fundamental_cycles
    ]
    return divide(add(terms), _poly(analysis.normalisation, analysis))


# -- responses -----------------------------------------------------------------------------------


def respond(quantity: Expression, perturbation: Perturbation, analysis: Analysis) -> Expression:
    """Return the derivative of a quantity by a perturbation, as such a tree."""
    changes = rate_changes(perturbation, analysis)

    def leaf(part: Expression) -> Expression:
        match part:
            case Symbol():
                return _symbol_change(part, perturbation)
            case Polynomial():
                return _polynomial_change(part.poly, changes, analysis)
            case Probability(states):
                chosen = [1 if k in states else 0 for k in range(analysis.graph.size)]
                return _mean_change(tuple(number(c) for c in chosen), perturbation, analysis)
            case Mean(place):
                values = analysis.network.observables[place].values
                return _mean_change(values, perturbation, analysis)
        return derivative(_closed_leaf(part, analysis), leaf)

    return closed_tree(derivative(quantity, leaf), analysis)


def rate_changes(perturbation: Perturbation, analysis: Analysis) -> RateChanges:
    """Return d ln w / d theta for every directed rate w that the perturbation changes."""
    rates, half = analysis.rates, Fraction(1, 2)
    match perturbation:
        case EnergyOf(state):
            return {
                place: ONE
                for place, (e, backward) in enumerate(rates.directions())
                if analysis.graph.ends[e][1 if backward else 0] == state
            }
        case BarrierOf(e):
            pair = ((rates.forward[e], number(-1)), (rates.backward[e], number(-1)))
        case BarriersOf(transitions):
            return {
                place: number(-1)
                for place, (e, _) in enumerate(rates.directions()) if e in transitions
            }
        case DriveOf(e):
            pair = ((rates.forward[e], number(half)), (rates.backward[e], number(-half)))
        case BySymbol(name, _):
            return _symbol_rate_changes(perturbation, name, analysis)
    return {place: change for place, change in pair if place is not None}


def _symbol_rate_changes(
    perturbation: Perturbation, name: str, analysis: Analysis
) -> RateChanges:
    changes: RateChanges = {}
    for place, (e, backward) in enumerate(analysis.rates.directions()):
        rate = analysis.rate_expression(e, backward)
        if name in symbols_of(rate):
            slope = divide(by_symbol(rate, name), rate)
            form = analysis.tidy(multiply([slope, _symbol_change(Symbol(name), perturbation)]))
            if form != ZERO:
                changes[place] = form
    return changes


def _symbol_change(part: Expression, perturbation: Perturbation) -> Expression:
    if not isinstance(perturbation, BySymbol) or part != Symbol(perturbation.name):
        return ZERO
    return part if perturbation.logarithmic else ONE


def _polynomial_change(poly: Poly, changes: RateChanges, analysis: Analysis) -> Expression:
    """Return d P / d theta: rates that change alike are taken together."""
    if not changes:
        return ZERO
    groups: dict[Expression, dict[int, int]] = {}
    for place, change in changes.items():
        groups.setdefault(change, {})[place] = 1
    ring = analysis.rates.ring
    return add(
        [
            multiply([change, _poly(logarithmic_derivative(poly, ring, weights), analysis)])
            for change, weights in groups.items()
        ]
    )


def _mean_change(
    values: tuple[Expression, ...], perturbation: Perturbation, analysis: Analysis
) -> Expression:
    """Return d/d theta of the sum of values[k] p_k, explicit dependence of the values included."""
    explicit: Expression = ZERO
    if isinstance(perturbation, BySymbol):
        slopes = tuple(
            multiply([by_symbol(value, perturbation.name),
                      _symbol_change(Symbol(perturbation.name), perturbation)])
            for value in values
        )
        if any(slope != ZERO for slope in slopes):
            explicit = divide(_weighted(slopes, analysis), _poly(analysis.normalisation, analysis))
    changes = dict(rate_changes(perturbation, analysis))
    parts = [*_energy_parts(values, changes, analysis)]
    for e in range(len(analysis.graph.ends)):
        flow = _changed_flow(e, changes, analysis)
        if flow != ZERO:
            forests = [analysis.forest_difference(k, e) for k in range(analysis.graph.size)]
            parts.append(multiply([flow, _combination(values, forests, analysis)]))
    below = power(_poly(analysis.normalisation, analysis), -2)
    by_forests = multiply([add(parts), below])
    if len(parts) <= 1:
        return add([explicit, by_forests])
    return add([explicit, _shorter(by_forests, _two_sums(values, perturbation, analysis),
                                   analysis)])


def _shorter(one: Expression, other: Expression, analysis: Analysis) -> Expression:
    lengths = [analysis.simplified(tree).literals() for tree in (one, other)]
    return one if lengths[0] <= lengths[1] else other


def _two_sums(
    values: tuple[Expression, ...], perturbation: Perturbation, analysis: Analysis
) -> Expression:
    """Return (N' D - N D')/D^2 for N the sum of values[k] N_k with the values held fixed."""
    changes = rate_changes(perturbation, analysis)
    total = analysis.normalisation
    ahead, back = [], []
    for k, value in enumerate(values):
        poly = analysis.tree_sum(k)
        ahead.append(multiply([value, _polynomial_change(poly, changes, analysis)]))
        back.append(multiply([value, _poly(poly, analysis)]))
    change = _polynomial_change(total, changes, analysis)
    below = _poly(total, analysis)
    return multiply([
        add([multiply([add(ahead), below]), negate(multiply([add(back), change]))]),
        power(below, -2),
    ])


def _energy_parts(
    values: tuple[Expression, ...], changes: RateChanges, analysis: Analysis
) -> list[Expression]:
    """Take out of ``changes`` the states all of whose outgoing rates change alike.

    They act as energies: d<Q>/d energy[j] = p_j (<Q> - Q_j), given here times D^2.
    """
    parts = []
    for state, change, leaving in uniform_states(changes, analysis):
        for place in leaving:
            del changes[place]
        shifted = tuple(add([value, negate(values[state])]) for value in values)
        own = _poly(analysis.tree_sum(state), analysis)
        parts.append(multiply([change, own, _weighted(shifted, analysis)]))
    return parts


def uniform_states(
    changes: RateChanges, analysis: Analysis
) -> list[tuple[int, Expression, list[int]]]:
    """Return the states all of whose outgoing rates change alike, the change, and those rates."""
    directions = analysis.rates.directions()
    found = []
    for state in range(analysis.graph.size):
        leaving = [
            place
            for place, (e, backward) in enumerate(directions)
            if analysis.graph.ends[e][1 if backward else 0] == state
        ]
        alike = {changes.get(place, ZERO) for place in leaving}
        if len(alike) == 1 and ZERO not in alike:
            found.append((state, alike.pop(), leaving))
    return found


def _changed_flow(e: int, changes: RateChanges, analysis: Analysis) -> Expression:
    """Return l+ w+ N_m - l- w- N_n for one transition."""
    rates = analysis.rates
    ahead = changes.get(rates.forward[e], ZERO)
    place = rates.backward[e]
    back = ZERO if place is None else changes.get(place, ZERO)
    if ahead == ZERO and back == ZERO:
        return ZERO
    if ahead == back or place is None:
        return multiply([ahead, _poly(analysis.current_numerator(e), analysis)])
    if ahead == negate(back):
        return multiply([ahead, _poly(analysis.traffic_numerator(e), analysis)])
    return add(
        [
            multiply([ahead, _poly(analysis.flow_numerator(e, False), analysis)]),
            negate(multiply([back, _poly(analysis.flow_numerator(e, True), analysis)])),
        ]
    )
