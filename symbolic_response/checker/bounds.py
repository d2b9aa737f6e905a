"""The claims at a point: the right side of each, whether it holds, and the ratio of the sides."""

from __future__ import annotations

from fractions import Fraction
from math import isqrt, prod

from .changes import bundle, check_pieces, directed, support
from .expressions import HALF, ONE, ZERO
from .network import Graph, Path
from .point import Solved, dot
from .reading import Work, invalid
from .record import Claim, Network, Record, Target, constant

Term = tuple[Fraction, Fraction | None]  # factor, and g of tanh(ln(g)/4): None where tanh is 1
EQUALITIES = ("energy-covariance", "current-exact")
PRECISIONS = (128, 512, 4096)
RATIO_BITS = 128


class Scale:
    """Y, S and the deviations of the observable that S goes with, of a target at a point."""

    def __init__(self, target: Target, at: Solved) -> None:
        values, self.s, known = at.above, ONE, True
        if target.kind != "mean":
            above, below = dot(at.above, at.p), dot(at.below, at.p)
            if constant(target.below):
                self.s = 1 / above
            elif constant(target.above):
                values, self.s = at.below, 1 / below
            else:
                known = False
            if target.kind == "ratio":
                self.s *= above / below
        mean, low, high = dot(values, at.p), min(values), max(values)
        self.deviations = [p * (q - mean) for p, q in zip(at.p, values, strict=True)]
        self.y = self.s  # for two observables that vary
        if known:
            self.y *= (mean - low) * (high - mean) / (high - low) if low < high else ZERO


def right_side(record: Record, claim: Claim, at: Solved, graph: Graph) -> list[Term]:
    """Return the terms of the right side of a claim at a point."""
    entry, where, name = f"{claim.entry}.name", f" at {at.where}", claim.name
    if record.path is not None:
        products = [Fraction(*_run_ratio(path, at, graph))
                    for path in paths_along(graph, record.path, entry)]
        return [(max(products, default=ZERO), None)]
    assert record.target is not None and record.perturbation is not None
    kind, e = record.perturbation.kind, record.perturbation.place
    if record.target.kind == "current":
        return [(_current(name, kind, e, at, graph), None)]
    scale = Scale(record.target, at)
    if name == "energy-covariance":
        return [(scale.s * abs(scale.deviations[e]), None)]
    if name == "energy-range":
        return [(scale.y, None)]
    if name == "parameter":
        return _parameter(record.network, claim, at, scale.y, graph)
    if name == "support":
        return [(scale.y * support(at.moves, graph, entry, where), None)]
    if name == "directed-bundle":
        return [(scale.y * directed(at.moves, graph, entry, where), None)]
    if name == "bundle":
        kappa, chosen = bundle(at.moves, graph, entry, where)
        cycles = graph.mixed_cycles(chosen)
        return [(scale.y * kappa, _largest_force(graph, cycles, at) if kappa else None)]
    factor = scale.y
    if name.startswith("splitting"):
        factor = scale.s * _largest_covariance(graph.splittings(e), scale.deviations, graph.work)
    if kind == "drive":
        return [(factor * HALF if graph.one_way[e] else factor, None)]
    if name.endswith("end-pair"):
        return [(factor, _end_pair(graph, e, at))]
    return [(factor, _largest_force(graph, graph.cycles(e), at))]


def _current(name: str, kind: str, e: int, at: Solved, graph: Graph) -> Fraction:
    """Return the right side of a claim about a current."""
    first, second = graph.ends[e]
    along, back = at.rates[2 * e] * at.p[first], at.rates[2 * e + 1] * at.p[second]
    value = abs(along - back) if kind == "barrier" else (along + back) / 2
    if name == "current-range":
        return value
    avoiding = sum((graph.forests(at.rates, 1 << k, e) for k in range(graph.states)), ZERO)
    return value * avoiding * at.p[0] / graph.forests(at.rates, 1)


def _largest_covariance(splittings: list[int], deviations: list[Fraction],
                        work: Work) -> Fraction:
    work.charge(len(splittings), deviations[0].denominator.bit_length())
    members = list(enumerate(deviations))
    return max(abs(sum((c for k, c in members if inside >> k & 1), ZERO))
               for inside in splittings)


def _run_ratio(path: Path, at: Solved, graph: Graph) -> tuple[int, int]:
    """Return the product of rates along a path over that against it, as two integers."""
    along, against = [at.rates[j] for j in path], [at.rates[j ^ 1] for j in path]
    above = prod(x.numerator for x in along) * prod(x.denominator for x in against)
    below = prod(x.denominator for x in along) * prod(x.numerator for x in against)
    graph.work.charge(len(path), above.bit_length() + below.bit_length())
    return above, below


def _largest_force(graph: Graph, cycles: list[Path], at: Solved) -> Fraction | None:
    """Return exp of the largest force of cycles, None where it is infinite."""
    best = (1, 1)
    for cycle in cycles:
        below, above = sorted(_run_ratio(cycle, at, graph))
        if above and not below:
            return None
        if above * best[1] > best[0] * below:
            best = above, below
    return Fraction(*best)


def _end_pair(graph: Graph, e: int, at: Solved) -> Fraction | None:
    """Return exp(abs(ln r)) for r = w+ a_m/(w- a_n), None where it is infinite."""
    low, high = sorted(at.rates[2 * e + direction] * graph.forests(at.rates, 1 << root, e)
                       for direction, root in enumerate(graph.ends[e]))
    if not high:
        return ONE
    return high / low if low else None


def paths_along(graph: Graph, ends: tuple[int, int], entry: str) -> list[Path]:
    """Return the paths that can be run along: it must be possible to run them against too."""
    found = [path for path in graph.paths(*ends) if graph.can_run(path)]
    if not all(graph.can_run(i ^ 1 for i in path) for path in found):
        raise invalid(entry, "only paths that can be run both ways, or against",
                      "a path that can be run along only")
    return found


def read_pieces(claim: Claim, network: Network, at: Solved,
                work: Work) -> dict[str, dict[int, Fraction]]:
    """Return the values of energies, barriers and singles of a claim."""
    return {key: {k: at.evaluate(one, f"{claim.entry}.parts.{key}.{network.names(key)[k]}", work)
                  for k, one in given.items()} for key, given in claim.parts.items()}


def _parameter(network: Network, claim: Claim, at: Solved, y: Fraction, graph: Graph) -> list[Term]:
    """Check the decomposition of the changes of rates, and return the terms it gives."""
    found = read_pieces(claim, network, at, graph.work)
    check_pieces(at.moves, graph, found, network, f"{claim.entry}.parts", f" at {at.where}")
    energies, barriers, singles = found.values()
    heights = [energies.get(k, ZERO) for k in range(graph.states)]
    first_factor = max(heights) - min(heights) + sum(singles.values(), ZERO)
    terms: list[Term] = [(y * first_factor, None)]
    for e in sorted(barriers):
        terms.append((y * barriers[e], _largest_force(graph, graph.cycles(e), at)))
    return terms


def decide(left: Fraction, terms: list[Term]) -> bool | None:
    """Decide left <= sum of factor * tanh(ln(g)/4) exactly; None where it is not settled."""
    rest: dict[Fraction, Fraction] = {}
    for factor, g in terms:
        root = _rational_root(g)
        if g is None:
            left -= factor
        elif root is not None:
            left -= factor * (root - 1) / (root + 1)
        else:
            rest[g] = rest.get(g, ZERO) + factor
    if left <= 0:
        return True
    if len(rest) <= 1:
        return any(squared(left, y, g) for g, y in rest.items())
    for bits in PRECISIONS:
        low, high = sum_bounds([(y, g) for g, y in rest.items()], bits)
        if left <= low:
            return True
        if left > high:
            return False
    return None


def squared(x: Fraction, y: Fraction, g: Fraction) -> bool:
    """Decide x <= y tanh(ln(g)/4) for x, y >= 0 and g >= 1: both conditions are needed."""
    return y >= x and (y + x) ** 2 <= g * (y - x) ** 2


def _rational_root(g: Fraction | None) -> Fraction | None:
    if g is None:
        return None
    above, below = isqrt(g.numerator), isqrt(g.denominator)
    exact = above * above == g.numerator and below * below == g.denominator
    return Fraction(above, below) if exact else None


def sum_bounds(terms: list[Term], bits: int) -> tuple[Fraction, Fraction]:
    """Return rational bounds of a sum, each sqrt(a/b) between neighbours on a grid."""
    low = high = ZERO
    for factor, g in terms:
        if g is None:
            low, high = low + factor, high + factor
            continue
        grid = g.denominator << bits
        root = isqrt(g.numerator * g.denominator << 2 * bits)
        above = root if root * root == g.numerator * g.denominator << 2 * bits else root + 1
        low += factor * Fraction(root - grid, root + grid)
        high += factor * Fraction(above - grid, above + grid)
    return low, high


def ratio(left: Fraction, terms: list[Term]) -> Fraction | None:
    """Return left over the lower bound of the right side; None where that is 0 and left is not."""
    if not left:
        return ZERO
    low, _ = sum_bounds(terms, RATIO_BITS)
    return left / low if low else None
