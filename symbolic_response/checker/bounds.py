"""The claims: the right side of each, whether it holds at a point, and the ratio of the sides."""

from __future__ import annotations

from fractions import Fraction
from math import isqrt, prod

from .expressions import HALF, ONE, ZERO, Expression
from .network import Graph, Path, determinant, generator
from .point import Solved, dot, evaluate
from .reading import Work, invalid
from .record import Claim, Record, Target

Term = tuple[Fraction, Fraction | None]  # factor, and g of tanh(ln(g)/4): None where tanh is 1
PRECISIONS = (128, 512, 4096)
RATIO_BITS = 128
APPLIES = {
    "path": ("path",),
    "energy": ("energy-covariance", "energy-range"),
    "barrier": ("barrier", "end-pair", "splitting-barrier", "splitting-end-pair"),
    "drive": ("drive", "splitting-drive"),
    "symbol": ("parameter", "support"),
}


def check_applies(record: Record) -> None:
    """Check what does not depend on a point: which claims there can be, and the observables."""
    kind = record.perturbation.kind if record.perturbation else "path"
    for i, claim in enumerate(record.claims):
        if claim.name not in APPLIES[kind]:
            raise invalid(f"claims[{i}].name", "one of " + ", ".join(APPLIES[kind]), claim.name)
        if record.target and claim.name.startswith(("energy-covariance", "splitting")):
            both = (record.target.above, record.target.below)
            if record.target.kind != "mean" and not any(_constant(one) for one in both):
                raise invalid(f"claims[{i}].name", "above or below the same for every state",
                              claim.name)
    if kind == "symbol" and record.target and record.perturbation:
        for entry, side in (("above", record.target.above), ("below", record.target.below)):
            for state, one in zip(record.network.states, side or (), strict=False):
                if record.perturbation.symbol in one.symbols:
                    raise invalid(f"target.{entry}.{state}",
                                  "no symbol that is the perturbation", one.text[:80])


def _constant(side: list[Expression] | None) -> bool:
    return side is not None and len({one.text for one in side}) == 1


class Scale:
    """Y, S and the deviations of the observable that S goes with, of a target at a point."""

    def __init__(self, target: Target, at: Solved) -> None:
        values, self.s, known = at.above, ONE, True
        if target.kind != "mean":
            above, below = dot(at.above, at.p), dot(at.below, at.p)
            if _constant(target.below):
                self.s = 1 / above
            elif _constant(target.above):
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


def right_side(record: Record, i: int, at: Solved, graph: Graph, work: Work) -> list[Term]:
    """Return the terms of the right side of claim ``i`` at a point."""
    claim = record.claims[i]
    if record.path is not None:
        return [(_path_product(graph, record.path, at, f"claims[{i}].name"), None)]
    assert record.target is not None and record.perturbation is not None
    scale, e = Scale(record.target, at), record.perturbation.place
    if claim.name == "energy-covariance":
        return [(scale.s * abs(scale.deviations[e]), None)]
    if claim.name == "energy-range":
        return [(scale.y, None)]
    if claim.name == "parameter":
        return _parameter(record, i, at, scale.y, graph, work)
    if claim.name == "support":
        return [(scale.y * _support(graph, at, f"claims[{i}].name"), None)]
    factor = scale.y
    if claim.name.startswith("splitting"):
        factor = scale.s * _largest_covariance(graph.splittings(e), scale.deviations, work)
    if record.perturbation.kind == "drive":
        return [(factor * HALF if graph.one_way[e] else factor, None)]
    strength = _end_pair if claim.name.endswith("end-pair") else _largest_force
    return [(factor, strength(graph, e, at, work))]


def _largest_covariance(splittings: list[int], deviations: list[Fraction],
                        work: Work) -> Fraction:
    work.charge(len(splittings), deviations[0].denominator.bit_length())
    members = list(enumerate(deviations))
    return max(abs(sum((c for k, c in members if inside >> k & 1), ZERO))
               for inside in splittings)


def _run_ratio(path: Path, at: Solved, work: Work) -> tuple[int, int]:
    """Return the product of rates along a path over that against it, as two integers."""
    along, against = [at.rates[j] for j in path], [at.rates[j ^ 1] for j in path]
    above = prod(x.numerator for x in along) * prod(x.denominator for x in against)
    below = prod(x.denominator for x in along) * prod(x.numerator for x in against)
    work.charge(len(path), above.bit_length() + below.bit_length())
    return above, below


def _largest_force(graph: Graph, e: int, at: Solved, work: Work) -> Fraction | None:
    """Return exp(F_max(e)), None where it is infinite."""
    best = (1, 1)
    for cycle in graph.cycles(e):
        along, against = graph.can_run(cycle), graph.can_run(tuple(j ^ 1 for j in cycle))
        if along != against:
            return None
        if along:
            above, below = _run_ratio(cycle, at, work)
            above, below = max(above, below), min(above, below)
            if above * best[1] > best[0] * below:
                best = above, below
    return Fraction(*best)


def _end_pair(graph: Graph, e: int, at: Solved, work: Work) -> Fraction | None:
    """Return exp(abs(ln r)) for r = w+ a_m/(w- a_n), None where it is infinite."""
    sides = []
    matrix = generator(graph.states, graph.ends, at.rates, without=e)
    for direction, root in enumerate(graph.ends[e]):
        minor = [[-x for j, x in enumerate(row) if j != root]
                 for i, row in enumerate(matrix) if i != root]
        sides.append(at.rates[2 * e + direction] * determinant(minor, work))
    if not any(sides):
        return ONE
    return max(sides) / min(sides) if all(sides) else None


def _path_product(graph: Graph, ends: tuple[int, int], at: Solved, entry: str) -> Fraction:
    best = ZERO
    for path in graph.paths_between(*ends):
        if graph.can_run(path):
            if not graph.can_run(tuple(j ^ 1 for j in path)):
                raise invalid(entry, "only paths that can be run both ways, or against",
                              "a path that can be run along only")
            best = max(best, Fraction(*_run_ratio(path, at, graph.work)))
    return best


def _support(graph: Graph, at: Solved, entry: str) -> Fraction:
    """Return m kappa; the rates that leave one state must change alike."""
    leaving: dict[int, set[Fraction]] = {}
    for e, ends in enumerate(graph.ends):
        for direction, state in enumerate(ends):
            if move := at.moves[2 * e + direction]:
                leaving.setdefault(state, set()).add(move)
    sizes = {abs(move) for moves in leaving.values() for move in moves}
    if len(sizes) > 1 or any(len(moves) > 1 for moves in leaving.values()):
        raise invalid(entry, f"rates that change alike at {at.where}",
                      ", ".join(sorted(str(size) for size in sizes)[:4]))
    return len(leaving) * (sizes.pop() if sizes else ZERO)


def _parameter(record: Record, i: int, at: Solved, y: Fraction, graph: Graph,
               work: Work) -> list[Term]:
    """Check the decomposition of the changes of rates, and return the terms it gives."""
    parts = record.claims[i].parts
    assert parts is not None
    found = []
    for key, known, given in zip(
            ("energies", "barriers", "singles"),
            (record.network.states, record.network.transitions, record.network.transitions),
            parts, strict=True):
        found.append({k: evaluate(one, f"claims[{i}].parts.{key}.{known[k]}", at.where,
                                  at.symbols, work)[0] for k, one in given.items()})
        if key != "energies":
            for k, value in found[-1].items():
                if value < 0:
                    raise invalid(f"claims[{i}].parts.{key}.{known[k]}",
                                  f"no negative value at {at.where}", value)
    energies, barriers, singles = found
    for e, (first, second) in enumerate(graph.ends):
        x = at.moves[2 * e] - energies.get(first, ZERO)
        z = at.moves[2 * e + 1] - energies.get(second, ZERO)
        rest = None if graph.one_way[e] else z
        if not _covered(x, rest, barriers.get(e, ZERO), singles.get(e, ZERO)):
            raise invalid(f"claims[{i}].parts",
                          f"pieces that give the changes of {record.network.transitions[e]}"
                          f" at {at.where}", "others")
    heights = [energies.get(k, ZERO) for k in range(graph.states)]
    first_factor = max(heights) - min(heights) + sum(singles.values(), ZERO)
    terms: list[Term] = [(y * first_factor, None)]
    for e in sorted(barriers):
        terms.append((y * barriers[e], _largest_force(graph, e, at, work)))
    return terms


def _covered(x: Fraction, y: Fraction | None, barrier: Fraction, single: Fraction) -> bool:
    if y is None:
        return abs(x) <= single
    return any(abs(x - b) + abs(y - b) <= single or (x + y == 2 * b and abs(x - y) <= single)
               for b in (barrier, -barrier))


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


def holds(claim: Claim, left: Fraction, terms: list[Term]) -> bool | None:
    """Decide a claim at a point."""
    if claim.name == "energy-covariance":
        return left == terms[0][0]
    return decide(left, terms)
