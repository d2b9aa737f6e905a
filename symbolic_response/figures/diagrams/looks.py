"""How lines and states look, once for TikZ and SVG; every difference shows in grey print too."""

from __future__ import annotations

from dataclasses import dataclass

Colour = tuple[int, int, int]
BLACK, WHITE, GREY, PALE = (0, 0, 0), (255, 255, 255), (190, 190, 190), (225, 225, 225)
RED, BLUE = (190, 0, 0), (0, 0, 165)


@dataclass(frozen=True, slots=True)
class Tip:
    """An arrow head in pt: a filled triangle with a notch, or its left half."""

    length: float
    width: float
    inset: float
    half: bool = False


@dataclass(frozen=True, slots=True)
class Line:
    """The look of a line; widths and dashes in pt."""

    colour: Colour
    width: float
    dashes: tuple[float, ...] = ()
    tip: Tip | None = None
    round: bool = False


@dataclass(frozen=True, slots=True)
class Mark:
    """The look of a state in a small picture: a disc or a square of half size ``radius``."""

    radius: float
    fill: Colour
    width: float = 0.0
    square: bool = False


DASHES = (2.6, 1.3)
LINES = {
    "band": Line(PALE, 7.0),
    "rate": Line(BLACK, 0.5, tip=Tip(5.0, 4.6, 1.4, half=True)),
    "step": Line(BLACK, 0.6, tip=Tip(5.2, 4.4, 1.4)),
    "behind": Line(GREY, 0.4),
    "behind chosen": Line(GREY, 1.3, DASHES),
    "branch": Line(BLACK, 0.7, tip=Tip(4.0, 3.4, 0.9)),
    "chosen branch": Line(RED, 1.5, DASHES, tip=Tip(4.8, 5.0, 0.9)),
    "along": Line(BLUE, 1.1, tip=Tip(4.4, 4.2, 0.9)),
    "inside": Line(BLACK, 0.9),
    "cut": Line(BLACK, 0.7, (0.05, 1.9), round=True),
    "chosen": Line(RED, 1.5, DASHES),
}
"""Lines by name."""
MARKS = {
    "dot": Mark(1.3, BLACK),
    "root": Mark(2.4, WHITE, 0.8),
    "other root": Mark(2.1, WHITE, 0.8, square=True),
    "in": Mark(2.2, BLACK, 0.6),
    "out": Mark(2.2, WHITE, 0.6),
}
"""States of small pictures by name."""
OUTLINE = 0.6
"""The width of the line around a state of the network's picture."""
