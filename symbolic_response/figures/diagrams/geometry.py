"""Points, curves and boxes of a drawing; a point is a complex number, x + y i, y upwards."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property
from itertools import pairwise
from typing import TypeAlias

Curve: TypeAlias = tuple[complex, ...]
"""A straight line (two points) or a cubic Bezier curve (four)."""
SAMPLES = 12


@dataclass(frozen=True)
class Box:
    """A rectangle with sides along the axes."""

    left: float
    bottom: float
    right: float
    top: float

    @staticmethod
    def around(centre: complex, half_width: float, half_height: float) -> Box:
        """Return the box of that centre."""
        x, y = centre.real, centre.imag
        return Box(x - half_width, y - half_height, x + half_width, y + half_height)

    @cached_property
    def centre(self) -> complex:
        """The middle."""
        return complex((self.left + self.right) / 2, (self.bottom + self.top) / 2)

    @property
    def width(self) -> float:
        """The length of the lower side."""
        return self.right - self.left

    @property
    def height(self) -> float:
        """The length of the left side."""
        return self.top - self.bottom

    def grown(self, margin: float) -> Box:
        """Return the box with a margin on all sides."""
        return Box(self.left - margin, self.bottom - margin, self.right + margin,
                   self.top + margin)

    def touches(self, other: Box) -> bool:
        """Whether two boxes share a point.

        >>> Box(0, 0, 2, 1).touches(Box(1, 0, 3, 1)), Box(0, 0, 2, 1).touches(Box(3, 0, 4, 1))
        (True, False)
        """
        return (self.left <= other.right and other.left <= self.right
                and self.bottom <= other.top and other.bottom <= self.top)

    def meets(self, start: complex, end: complex) -> bool:
        """Whether a straight line has a point in the box (Liang and Barsky's clipping).

        >>> Box(0, 0, 2, 1).meets(-1 + 0.5j, 3 + 0.5j), Box(0, 0, 2, 1).meets(-1 + 2j, 3 + 2j)
        (True, False)
        """
        low, high = 0.0, 1.0
        step = end - start
        for speed, to_low, to_high in (
            (step.real, self.left - start.real, self.right - start.real),
            (step.imag, self.bottom - start.imag, self.top - start.imag),
        ):
            if speed == 0:
                if to_low > 0 or to_high < 0:
                    return False
                continue
            one, other = sorted((to_low / speed, to_high / speed))
            low, high = max(low, one), min(high, other)
            if low > high:
                return False
        return True


def hull(boxes: Sequence[Box]) -> Box:
    """Return the smallest box around boxes."""
    return Box(min(b.left for b in boxes), min(b.bottom for b in boxes),
               max(b.right for b in boxes), max(b.top for b in boxes))


def point(curve: Curve, t: float) -> complex:
    """Return the point at parameter ``t``, 0 to 1."""
    s = 1 - t
    if len(curve) == 2:
        return s * curve[0] + t * curve[1]
    a, b, c, d = curve
    return s**3 * a + 3 * s * s * t * b + 3 * s * t * t * c + t**3 * d


def direction(curve: Curve, t: float) -> complex:
    """Return the unit vector along the curve at ``t``."""
    if len(curve) == 2:
        return unit(curve[1] - curve[0])
    a, b, c, d = curve
    s = 1 - t
    return unit(s * s * (b - a) + 2 * s * t * (c - b) + t * t * (d - c))


def unit(vector: complex) -> complex:
    """Return a vector of length 1 in the same direction."""
    return vector / abs(vector)


def part(curve: Curve, start: float, end: float) -> Curve:
    """Return the piece of a curve between two parameters (de Casteljau's construction)."""
    if len(curve) == 2:
        return point(curve, start), point(curve, end)
    return _head(_head(curve[::-1], 1 - start)[::-1], (end - start) / (1 - start))


def _head(curve: Curve, t: float) -> Curve:
    rows = [list(curve)]
    while len(rows[-1]) > 1:
        last = rows[-1]
        rows.append([(1 - t) * a + t * b for a, b in pairwise(last)])
    return tuple(row[0] for row in rows)


def corners(curve: Curve, samples: int = SAMPLES) -> tuple[complex, ...]:
    """Return points on a curve, a straight line's two ends."""
    if len(curve) == 2:
        return curve
    return tuple(point(curve, place / samples) for place in range(samples + 1))


def arc(start: complex, end: complex, bend: float) -> Curve:
    """Return a line that leaves ``bend`` degrees to the left of the straight one, and returns."""
    if bend == 0:
        return start, end
    handle = 0.39 * (end - start)
    turn = complex(math.cos(math.radians(bend)), math.sin(math.radians(bend)))
    return start, start + handle * turn, end - handle * turn.conjugate(), end


def beside(curve: Curve, offset: float) -> Curve:
    """Return nearly the same curve, ``offset`` to its left."""
    first = 1j * offset * unit(curve[1] - curve[0])
    last = 1j * offset * unit(curve[-1] - curve[-2])
    if len(curve) == 2:
        return curve[0] + first, curve[1] + last
    return curve[0] + first, curve[1] + first, curve[2] + last, curve[3] + last


def distance(place: complex, start: complex, end: complex) -> float:
    """Return the distance of a point from a straight line with ends.

    >>> distance(1 + 1j, 0, 2), distance(3 + 0j, 0, 2)
    (1.0, 1.0)
    """
    along = end - start
    t = ((place - start) * along.conjugate()).real / abs(along) ** 2
    return abs(place - start - min(1.0, max(0.0, t)) * along)


def cross(a: complex, b: complex, c: complex, d: complex) -> bool:
    """Whether the lines ab and cd cross in their insides.

    >>> cross(0, 2 + 2j, 2, 2j), cross(0, 1, 1j, 1 + 1j)
    (True, False)
    """
    def side(one: complex, two: complex, three: complex) -> float:
        return ((two - one).conjugate() * (three - one)).imag

    return (side(a, b, c) * side(a, b, d) < -1e-12) and (side(c, d, a) * side(c, d, b) < -1e-12)
