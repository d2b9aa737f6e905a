"""Small pictures of a graph: cycles, spanning trees, splittings, forests."""

from __future__ import annotations

from collections.abc import Collection, Iterable, Mapping
from dataclasses import dataclass

from symbolic_response.figures.diagrams.geometry import (
    Box,
    Curve,
    arc,
    corners,
    hull,
    part,
    point,
)
from symbolic_response.figures.diagrams.labels import label
from symbolic_response.figures.diagrams.layout import Positions
from symbolic_response.figures.diagrams.looks import MARKS
from symbolic_response.figures.diagrams.network import bends
from symbolic_response.figures.diagrams.pictures import Dot, Picture, Stroke
from symbolic_response.topology import Cycle, Graph
from symbolic_response.topology.graph import members

SIGNS = ("+", "-")
LENGTH, LEAST, LOWEST, WIDEST = 22.0, 15.0, 20.0, 110.0
SPACE, BELOW, BESIDE, BEFORE, MARGIN, SIZE = 0.8, 3.0, 1.0, 3.0, 0.5, 8


@dataclass(frozen=True, slots=True)
class Small:
    """A graph as it is drawn small: centres of the states and lines of the transitions."""

    graph: Graph
    centres: tuple[complex, ...]
    lines: tuple[Curve, ...]
    chosen: int | None

    def cycle(self, cycle: Cycle, latex: str) -> Picture:
        """Return a cycle in its orientation, labelled below."""
        steps = dict(zip(cycle.transitions, cycle.along, strict=True))
        return self._picture(steps, "along", "along", {}, latex)

    def tree(self, forward: int, backward: int, root: int, latex: str = "") -> Picture:
        """Return a tree towards a root, given by what it uses forward and backward (masks)."""
        return self._picture(_steps(forward, backward), "branch", "chosen branch",
                             {root: "root"}, latex)

    def forest(
        self, forward: int, backward: int, root: int, other: int, latex: str = ""
    ) -> Picture:
        """Return a forest of two trees; the root ``other`` of the second one is a square."""
        return self._picture(_steps(forward, backward), "branch", "chosen branch",
                             {root: "root", other: "other root"}, latex)

    def splitting(self, side: int, latex: str = "") -> Picture:
        """Return a splitting: the set (a mask) filled, the rest open, cut transitions dotted."""
        inside = set(members(side))
        strokes = []
        for e, (first, second) in enumerate(self.graph.ends):
            cut = (first in inside) != (second in inside)
            look = "chosen" if e == self.chosen else "cut" if cut else "inside"
            strokes.append(self._stroke(e, look, ("in", "in")))
        looks = {k: "in" if k in inside else "out" for k in range(self.graph.size)}
        return self._whole(strokes, looks, latex)

    def _picture(
        self, steps: Mapping[int, bool], look: str, chosen_look: str, marks: Mapping[int, str],
        latex: str,
    ) -> Picture:
        looks = {k: marks.get(k, "dot") for k in range(self.graph.size)}
        behind = [
            self._stroke(e, "behind chosen" if e == self.chosen else "behind", ("", ""))
            for e in range(len(self.graph.ends)) if e not in steps
        ]
        front = [
            self._stroke(e, chosen_look if e == self.chosen else look,
                         (looks[self.graph.ends[e][0]], looks[self.graph.ends[e][1]]), ahead)
            for e, ahead in sorted(steps.items())
        ]
        return self._whole([*behind, *front], looks, latex)

    def _stroke(
        self, transition: int, look: str, marks: tuple[str, str], ahead: bool = True
    ) -> Stroke:
        """Return the line of a transition, kept clear of its states, in the direction it runs."""
        line = self.lines[transition]
        gaps = [_room(mark) for mark in marks]
        start, end = _leaves(line, gaps[0]), 1 - _leaves(line[::-1], gaps[1])
        shown = part(line, start, end)
        return Stroke(shown if ahead else shown[::-1], look, transition)

    def _whole(
        self, strokes: Collection[Stroke], looks: Mapping[int, str], latex: str
    ) -> Picture:
        room = max(MARKS[name].radius + MARKS[name].width / 2 for name in ("root", "in"))
        boxes = [Box.around(z, room, room) for z in self.centres]
        boxes += [Box.around(z, 1.0, 1.0) for line in self.lines for z in corners(line)]
        box = hull(boxes).grown(MARGIN)
        dots = tuple(Dot(self.centres[k], look) for k, look in sorted(looks.items()))
        if not latex:
            return Picture(box, tuple(strokes), dots)
        if latex in SIGNS:
            before = label(latex, 10)
            middle = complex(box.left - BESIDE - before.width / 2, box.centre.imag)
            before = before.centred(middle)
            whole = Box(before.box.left - BEFORE, box.bottom, box.right, box.top)
            return Picture(whole, tuple(strokes), dots, labels=(before,))
        below = label(latex, SIZE)
        below = below.centred(complex(box.centre.real, box.bottom - BELOW - below.height / 2))
        whole = Box(min(box.left, below.box.left), below.box.bottom - MARGIN,
                    max(box.right, below.box.right), box.top)
        return Picture(whole, tuple(strokes), dots, labels=(below,))


def small(graph: Graph, positions: Positions, chosen: int | None = None) -> Small:
    """Return a graph ready to be drawn small; ``chosen`` is the transition that is set off."""
    gaps = [abs(z - w) for k, z in enumerate(positions) for w in positions[:k]]
    width = max(z.real for z in positions) - min(z.real for z in positions)
    scale = max(LENGTH, LEAST / min(gaps))
    scale = max(min(scale, WIDEST / max(width, 0.1)), LOWEST / max(gaps))
    centres = tuple(z * scale for z in positions)
    lines = tuple(
        arc(centres[first], centres[second], bend)
        for (first, second), bend in zip(graph.ends, bends(graph), strict=True)
    )
    return Small(graph, centres, lines, chosen)


def alike(pictures: Iterable[Picture]) -> tuple[Picture, ...]:
    """Return pictures that all take the same room."""
    every = list(pictures)
    box = hull([picture.box for picture in every])
    return tuple(
        Picture(box, picture.strokes, picture.dots, picture.shapes, picture.labels)
        for picture in every
    )


def _steps(forward: int, backward: int) -> dict[int, bool]:
    return dict.fromkeys(members(forward), True) | dict.fromkeys(members(backward), False)


def _room(mark: str) -> float:
    return MARKS[mark].radius + MARKS[mark].width / 2 + SPACE if mark else 0.0


def _leaves(line: Curve, gap: float) -> float:
    """Return the parameter at which a line is ``gap`` away from its start."""
    low, high = 0.0, 0.45
    for _ in range(40):
        middle = (low + high) / 2
        if abs(point(line, middle) - line[0]) < gap:
            low = middle
        else:
            high = middle
    return low if gap else 0.0
