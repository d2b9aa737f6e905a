r"""``\frac{\partial X}{\partial Y}`` and ``\partial_{Y}``: what is differentiated, and by what."""

from __future__ import annotations

from dataclasses import dataclass, replace

from symbolic_response.errors import FormulaError
from symbolic_response.expressions.tree import Expression, symbols_of, walk
from symbolic_response.hand.latex.items import CLOSING, OPENING, Item, Items, key_of
from symbolic_response.hand.latex.names import Names
from symbolic_response.hand.latex.table import Match
from symbolic_response.hand.latex.tokens import formula_error
from symbolic_response.network.quantities import (
    BySymbol,
    Perturbation,
    Response,
    walk_quantity,
)

MAX_ORDER = 6


@dataclass(frozen=True, slots=True)
class Derivative:
    """The perturbations, the outermost first, and the items inside the fraction, if any."""

    by: tuple[Perturbation, ...]
    inside: Items = ()


def as_derivative(item: Item, names: Names, source: str) -> Derivative | None:
    r"""Return the derivative that a fraction is, None where it is an ordinary fraction.

    Both sides begin with ``\partial``, ``d`` or ``\mathrm{d}``. Raises FormulaError where d is a
    symbol too, and where what stands below is no perturbation.
    """
    top, bottom = item.arguments
    mark = _mark(top[0]) if top else None
    if mark is None or not bottom or _mark(bottom[0]) != mark:
        return None
    if mark == "d" and names.match((replace(top[0], above=None),)) is not None:
        raise formula_error(source, item.start,
                            r"d is a symbol of the network; write \partial for a derivative, and"
                            " cancel d in a fraction")
    order = _times(top[0].above)
    if order is None:
        raise formula_error(source, top[0].start,
                            f"the order of a derivative is a number from 1 to {MAX_ORDER}")
    by: list[Perturbation] = []
    for begin, end in _parts(bottom, mark):
        if bottom[begin].above is not None or begin + 1 == end:
            raise formula_error(source, bottom[begin].start,
                                r"below a derivative write \partial Y, or \partial Y^2")
        by += _perturbations(bottom[begin + 1 : end], names, source)
    if len(by) != order:
        raise formula_error(source, item.start,
                            f"a derivative of order {order} by {len(by)} variables; write"
                            rf" \frac{{\partial^{len(by)} X}}{{...}}")
    return Derivative(tuple(by), top[1:])


def subscripted(item: Item, names: Names, source: str) -> Derivative:
    r"""Return the derivative that ``\partial_{Y}`` is."""
    if not item.below:
        raise formula_error(source, item.start,
                            r"\partial stands alone; write \frac{\partial X}{\partial Y} or"
                            r" \partial_{Y} X")
    times = _times(item.above)
    if times is None:
        raise formula_error(source, item.start,
                            f"the order of a derivative is a number from 1 to {MAX_ORDER}")
    return Derivative(tuple(_perturbations(item.below, names, source)) * times)


def differentiated(
    quantity: Expression, derivative: Derivative, names: Names, source: str, start: int
) -> Expression:
    """Return the response of a quantity to what a derivative is taken by.

    Raises FormulaError where a symbol that the quantity holds is written like the energy, barrier
    or drive it stands for, so that either may be meant.
    """
    explicit = {name for part in walk_quantity(quantity) for name in symbols_of(part)}
    if _nested(quantity) + len(derivative.by) > MAX_ORDER:
        raise formula_error(source, start, f"derivatives nested more than {MAX_ORDER} deep; name"
                                           " one of them")
    for by in reversed(derivative.by):
        chosen = by
        if isinstance(by, BySymbol) and not by.logarithmic and by.name in names.own:
            if by.name not in explicit:
                chosen = names.own[by.name]
            elif by.name in names.twofold:
                raise formula_error(
                    source, start,
                    f"the quantity holds {by.name} itself, and the derivative may include that or"
                    " not; write the quantity in plain syntax, by energy[...], barrier[...],"
                    f" drive[...] or {by.name}",
                )
        quantity = Response(quantity, chosen)
    return quantity


def _nested(quantity: Expression) -> int:
    """Return how many responses are within each other."""
    depth, level = 0, [quantity]
    while level := [part.quantity for whole in level for part in walk(whole)
                    if isinstance(part, Response)]:
        depth += 1
    return depth


def _mark(item: Item) -> str | None:
    if item.below is not None or item.primes:
        return None
    if item.head == r"\partial" or item.head == "d":
        return item.head
    upright = item.head in (r"\mathrm", r"\text") and key_of(item.arguments[0]) == "d"
    return "d" if upright else None


def _times(above: Items | None) -> int | None:
    if above is None:
        return 1
    shown = key_of(above)
    return int(shown) if len(shown) == 1 and shown in "123456" else None


def _parts(bottom: Items, mark: str) -> list[tuple[int, int]]:
    starts = [place for place, item in enumerate(bottom) if _mark(item) == mark]
    return list(zip(starts, [*starts[1:], len(bottom)], strict=True))


def _perturbations(items: Items, names: Names, source: str) -> list[Perturbation]:
    """Return one perturbation as often as its power says."""
    inside, power = _unwrapped(items)
    logarithmic = bool(inside) and inside[0].head in (r"\ln", r"\log")
    if logarithmic:
        if inside[0].above is not None or inside[0].below is not None:
            raise formula_error(source, inside[0].start, r"write \partial (\ln c)^2")
        inside, power_inside = _unwrapped(inside[1:])
        if power_inside is not None:
            raise formula_error(source, items[0].start, r"write \partial (\ln c)^2")
    match = names.perturbation(inside) if inside else None
    if match is None or match.count != len(inside):
        raise formula_error(
            source, items[0].start,
            f"{key_of(items)} is nothing that a quantity can respond to"
            f"{names.nearest(inside, perturbation=True)}",
        )
    if match.power is not None:
        if power is not None or logarithmic:
            raise formula_error(source, items[0].start, r"write the power once, behind parentheses")
        power = match.power
    times = _times(power)
    if times is None:
        raise formula_error(source, items[0].start,
                            f"a derivative is taken 1 to {MAX_ORDER} times by one variable")
    return [_meaning(match, logarithmic, items[0], names, source)] * times


def _meaning(
    match: Match, logarithmic: bool, item: Item, names: Names, source: str
) -> Perturbation:
    def refused(message: str) -> FormulaError:
        return formula_error(source, item.start, message)

    if match.others or len(match.meanings) != 1:
        raise refused(f"{match.shown} has two meanings in this network; give one of them another"
                      " LaTeX name")
    meaning = match.meanings[0]
    if logarithmic:
        if not isinstance(meaning, BySymbol):
            raise refused(rf"\ln {match.shown}: only symbols have logarithmic derivatives; write"
                          rf" \partial {match.shown}")
        if meaning.name not in names.positive:
            raise refused(rf"\ln {match.shown} needs a positive symbol; write"
                          rf" \partial {match.shown}")
        return BySymbol(meaning.name, True)
    assert isinstance(meaning, Perturbation)
    return meaning


def _unwrapped(items: Items) -> tuple[Items, Items | None]:
    """Return what stands in one pair of brackets around all, and the power behind them."""
    if len(items) > 2 and items[0].head in OPENING and items[-1].head in CLOSING:
        return items[1:-1], items[-1].above
    return items, None
