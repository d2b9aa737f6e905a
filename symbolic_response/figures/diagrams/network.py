"""The picture of a network with its rates."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from itertools import combinations, pairwise

from symbolic_response.figures.diagrams.geometry import (
    Box,
    Curve,
    arc,
    beside,
    corners,
    direction,
    hull,
    part,
    point,
)
from symbolic_response.figures.diagrams.labels import Label, RateLabels, label, rate_labels
from symbolic_response.figures.diagrams.layout import Positions
from symbolic_response.figures.diagrams.looks import LINES
from symbolic_response.figures.diagrams.pictures import Picture, Shape, Stroke
from symbolic_response.figures.diagrams.placing import candidates, free, lined, together
from symbolic_response.network.model import Network
from symbolic_response.response.notation import Notation
from symbolic_response.topology import Graph

APART = 0.95
"""Half the distance between the two lines of a transition, in pt."""
PADDING, FROM_STATE = 3.5, 1.0
SHORTEST, BETWEEN = 17.0, 9.0
START, LEAST, ROOM, LARGER, ATTEMPTS = 50.0, 30.0, 24.0, 1.1, 25
MARGIN = 1.0
STRETCH, MOST = 2.0, 84


@dataclass(frozen=True, slots=True)
class Sizes:
    """Radius of a state, size of its label, size of the labels of rates, in pt."""

    radius: float
    name: int
    rate: int


USUAL, COMPACT = Sizes(9.0, 10, 8), Sizes(7.0, 8, 7)

Curves = dict[tuple[int, bool], Curve]


@dataclass(frozen=True, slots=True)
class NetworkPicture:
    """The picture, and what stands at its rates: ``expressions``, ``letters`` or ``none``.

    ``letters`` are the transitions that show letters.
    """

    picture: Picture
    rates: str
    letters: tuple[int, ...]


def network_picture(
    network: Network, graph: Graph, notation: Notation, positions: Positions, *,
    width: float, letters: str | None = None, expressions: bool = True,
    transition: int | None = None,
) -> NetworkPicture:
    """Return the picture of a network, no wider than ``width`` where that can be.

    Expressions of rates come first, then letters, then no labels at rates: the first with which
    nothing clashes within the width; none at more than 42 transitions. ``letters``:
    ``"generator"``, ``"rate"`` or None for what is shorter. ``transition`` is marked by a band
    behind it.
    """
    kinds = [("letters", USUAL), ("letters", COMPACT), ("none", USUAL)]
    if expressions:
        kinds.insert(0, ("expressions", USUAL))
    if 2 * len(graph.ends) > MOST:
        kinds = [("none", USUAL)]
    for kind, sizes in kinds:
        shown = RateLabels({}, ())
        if kind != "none":
            shown = rate_labels(network, notation, letters, kind == "expressions")
        fitting = (width - 2 * sizes.radius - ROOM) / _extent(positions)
        scale = min(START * sizes.radius / USUAL.radius, max(LEAST, fitting))
        for _ in range(ATTEMPTS):
            frame = _Frame(graph, notation.states, positions, scale, transition, sizes)
            is_last = frame.bounds.width * LARGER > width
            picture = frame.picture(shown.texts, kind == "none" and is_last)
            if picture is not None and (picture.box.width <= width or kind == "none"):
                return NetworkPicture(picture, kind, shown.letters)
            if is_last:
                break
            scale *= LARGER
    raise AssertionError("the last picture is made whether or not it is clear")


def _extent(positions: Positions) -> float:
    return max(z.real for z in positions) - min(z.real for z in positions) + 0.01


def bends(graph: Graph) -> tuple[float, ...]:
    """Return by how many degrees each transition is bent to the left of its first direction.

    Two parallel ones by 30 degrees, more of them in even steps up to 50.

    >>> bends(Graph(2, ((0, 1), (1, 0)), (False, False)))
    (30.0, 30.0)
    """
    groups: dict[frozenset[int], list[int]] = {}
    for e, ends in enumerate(graph.ends):
        groups.setdefault(frozenset(ends), []).append(e)
    found = [0.0] * len(graph.ends)
    for group in groups.values():
        outer = {1: 0.0, 2: 30.0}.get(len(group), 50.0)
        for place, e in enumerate(group):
            angle = outer * (1 - 2 * place / (len(group) - 1)) if len(group) > 1 else 0.0
            found[e] = angle if graph.ends[e][0] == min(graph.ends[e]) else -angle
    return tuple(angle + 0.0 for angle in found)


class _Frame:
    """States and lines of a picture at one scale."""

    def __init__(
        self, graph: Graph, names: Sequence[str], positions: Positions, scale: float,
        marked: int | None, sizes: Sizes,
    ) -> None:
        self.graph = graph
        self.marked = marked
        self.sizes = sizes
        plain = [label(latex, sizes.name) for latex in names]
        wide = max(name.width for name in plain) / (4 * sizes.radius)
        stretch = min(STRETCH, max(1.0, wide))
        centres = [scale * complex(z.real * stretch, z.imag) for z in positions]
        self.names = [name.centred(z) for name, z in zip(plain, centres, strict=True)]
        self.shapes = [_shape(name, sizes.radius) for name in self.names]
        self.middles = [
            arc(centres[first], centres[second], bend)
            for (first, second), bend in zip(graph.ends, bends(graph), strict=True)
        ]
        self.bounds = hull([shape.box for shape in self.shapes])

    def curves(self) -> Curves:
        """Return the visible line of each directed rate; those hidden by states are left out."""
        found: Curves = {}
        for e, (first, second) in enumerate(self.graph.ends):
            ends, middle = (self.shapes[first], self.shapes[second]), self.middles[e]
            offset = 0.0 if self.graph.one_way[e] else APART
            line = _between(beside(middle, offset), *ends)
            if line is not None:
                found[e, False] = line
            back = _between(beside(middle[::-1], offset), *ends[::-1])
            if back is not None and not self.graph.one_way[e]:
                found[e, True] = back
        return found

    def is_clear(self, curves: Curves) -> bool:
        """Whether lines are long enough and states keep apart from each other and from lines."""
        if len(curves) < sum(2 - single for single in self.graph.one_way):
            return False
        if any(abs(curve[-1] - curve[0]) < SHORTEST for curve in curves.values()):
            return False
        if any(a.box.grown(BETWEEN).touches(b.box) for a, b in combinations(self.shapes, 2)):
            return False
        return not any(
            shape.box.grown(3).meets(a, b)
            for k, shape in enumerate(self.shapes)
            for (e, _), curve in curves.items() if k not in self.graph.ends[e]
            for a, b in pairwise(corners(curve))
        )

    def picture(
        self, texts: Mapping[tuple[int, bool], str], anyhow: bool = False
    ) -> Picture | None:
        """Return the picture, None where something clashes (unless it is wanted anyhow)."""
        curves = self.curves()
        if not (anyhow or self.is_clear(curves)):
            return None
        placed = self.placed(curves, texts) if texts else []
        if placed is None:
            return None
        strokes = [
            Stroke(curve, "step" if self.graph.one_way[e] else "rate", e)
            for (e, _), curve in curves.items()
        ]
        if self.marked is not None:
            ends = [self.shapes[k] for k in self.graph.ends[self.marked]]
            band = _between(self.middles[self.marked], ends[0], ends[1], 3.0)
            if band is not None:
                strokes.insert(0, Stroke(band, "band", self.marked))
        boxes = [shape.box for shape in self.shapes] + [shown.box for shown in placed]
        boxes += [around for _, around in lined([stroke.curve for stroke in strokes])]
        return Picture(hull(boxes).grown(MARGIN), tuple(strokes), shapes=tuple(self.shapes),
                       labels=(*self.names, *placed))

    def placed(
        self, curves: Curves, texts: Mapping[tuple[int, bool], str]
    ) -> list[Label] | None:
        """Return the labels of the rates where they touch nothing, None if there is no way."""
        lines = {
            key: lined([curve] + ([] if self.graph.one_way[key[0]] else [_barb(curve)]))
            for key, curve in curves.items()
        }
        if self.marked is not None:
            half = LINES["band"].width / 2
            lines[self.marked, False] = lines.get((self.marked, False), []) + lined(
                [beside(self.middles[self.marked], side) for side in (half, -half)])
        boxes = [shape.box for shape in self.shapes]
        choices = []
        for (e, back), curve in curves.items():
            sides = (1, -1) if self.graph.one_way[e] else (1,)
            every = candidates(label(texts[e, back], self.sizes.rate), curve, sides)
            own = [line for (other, _), each in lines.items() if other == e for line in each]
            others = [line for (other, _), each in lines.items() if other != e for line in each]
            choices.append(free(every, own, others, boxes))
            if not choices[-1]:
                return None
        return together(choices)


def _shape(name: Label, radius: float) -> Shape:
    centre = name.box.centre
    half = max(radius, name.width / 2 + PADDING)
    if half <= radius + 1.5:
        return Shape(Box.around(centre, half, half), half)
    tall = max(radius - 0.5, (name.height + name.depth) / 2 + PADDING)
    return Shape(Box.around(centre, half + 1, tall), 4.0)


def _barb(curve: Curve) -> Curve:
    """Return the outer side of the half arrow head at the end of a curve."""
    tip = LINES["rate"].tip
    if tip is None:
        return curve[-2:]
    ahead = direction(curve, 1.0)
    return curve[-1], curve[-1] + ahead * complex(-tip.length, tip.width / 2)


def _between(
    curve: Curve, first: Shape, second: Shape, gap: float = FROM_STATE
) -> Curve | None:
    """Return the part of a curve outside both its states, None if nothing is left."""
    start, end = _leaves(curve, first, gap), 1 - _leaves(curve[::-1], second, gap)
    return part(curve, start, end) if start < end - 0.01 else None


def _leaves(curve: Curve, shape: Shape, gap: float) -> float:
    """Return the parameter at which a curve that starts in a shape is ``gap`` away from it."""
    low, high = 0.0, 1.0
    for _ in range(40):
        middle = (low + high) / 2
        if outside(shape, point(curve, middle)) < gap:
            low = middle
        else:
            high = middle
    return high


def outside(shape: Shape, place: complex) -> float:
    """Return the distance of a point from the outline of a state, negative inside."""
    half = complex(shape.box.width / 2 - shape.radius, shape.box.height / 2 - shape.radius)
    away = place - shape.box.centre
    across, up = abs(away.real) - half.real, abs(away.imag) - half.imag
    beyond = abs(complex(max(across, 0.0), max(up, 0.0)))
    return beyond + min(max(across, up), 0.0) - shape.radius
