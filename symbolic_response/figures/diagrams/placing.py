"""Finding a place for every label of a picture, so that it touches nothing."""

from __future__ import annotations

from collections.abc import Sequence
from itertools import pairwise

from symbolic_response.figures.diagrams.geometry import (
    Box,
    Curve,
    corners,
    direction,
    hull,
    point,
)
from symbolic_response.figures.diagrams.labels import Label

ALONG = (0.5, 0.42, 0.58, 0.34, 0.66, 0.26, 0.74)
GAPS = (2.2, 4.0)
CLEAR, FOREIGN, APART = 1.2, 2.6, 2.0
TRIES = 1200

Outlined = tuple[tuple[complex, ...], Box]


def candidates(shown: Label, curve: Curve, sides: Sequence[int]) -> list[Label]:
    """Return places for a label beside a curve, the best first; side 1 is to its left."""
    made = []
    for gap in GAPS:
        for t in ALONG:
            for side in sides:
                normal = 1j * side * direction(curve, t)
                reach = (abs(normal.real) * shown.width
                         + abs(normal.imag) * (shown.height + shown.depth)) / 2
                made.append(shown.centred(point(curve, t) + normal * (gap + reach)))
    return made


def free(
    choices: Sequence[Label], own: Sequence[Outlined], others: Sequence[Outlined],
    boxes: Sequence[Box],
) -> list[Label]:
    """Return the choices that touch no box and no line, and keep away from lines not their own."""
    return [
        choice for choice in choices
        if not any(choice.box.grown(CLEAR).touches(box) for box in boxes)
        and not _crossed(choice.box.grown(CLEAR), own)
        and not _crossed(choice.box.grown(FOREIGN), others)
    ]


def _crossed(room: Box, lines: Sequence[Outlined]) -> bool:
    return any(
        room.touches(around) and any(room.meets(a, b) for a, b in pairwise(line))
        for line, around in lines
    )


def lined(curves: Sequence[Curve]) -> list[Outlined]:
    """Return curves as points with the box around them."""
    found = []
    for curve in curves:
        line = corners(curve)
        found.append((line, hull([Box(z.real, z.imag, z.real, z.imag) for z in line])))
    return found


def together(choices: Sequence[Sequence[Label]]) -> list[Label] | None:
    """Return one choice for each label such that no two touch; None if none is found.

    The label with the fewest choices left comes first; a bounded search.
    """
    if any(not each for each in choices):
        return None
    chosen: dict[int, Label] = {}
    left = {place: list(each) for place, each in enumerate(choices)}
    stack: list[tuple[int, list[Label], dict[int, list[Label]]]] = []
    for _ in range(TRIES):
        if not left:
            return [chosen[place] for place in range(len(choices))]
        place = min(left, key=lambda k: (len(left[k]), k))
        stack.append((place, list(left[place]), left))
        while stack:
            place, options, before = stack[-1]
            chosen.pop(place, None)
            if not options:
                stack.pop()
                continue
            pick = options.pop(0)
            room = pick.box.grown(APART)
            left = {
                k: [o for o in each if not room.touches(o.box)]
                for k, each in before.items() if k != place
            }
            if all(left.values()):
                chosen[place] = pick
                break
        else:
            return None
    return None
