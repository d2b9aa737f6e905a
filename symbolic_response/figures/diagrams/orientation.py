"""How a drawing is turned: lines level and upright, the first state on top, a wide base."""

from __future__ import annotations

import cmath
import math
from collections.abc import Iterator

LEVEL = 1e-4


def oriented(
    places: tuple[complex, ...], pairs: tuple[tuple[int, int], ...]
) -> tuple[complex, ...]:
    """Return positions turned and mirrored to the best of the ways that make some line level.

    >>> [round(z.imag, 3) for z in oriented((0j, 1j), ((0, 1),))]
    [0.0, 0.0]
    """
    best, most = places, -math.inf
    for turn in _turns(places, pairs):
        for mirrored in (False, True):
            moved = _rounded([(z.conjugate() if mirrored else z) * turn for z in places])
            score = uprightness(moved, pairs)
            if score > most:
                best, most = moved, score
    return best


def _rounded(places: list[complex]) -> tuple[complex, ...]:
    middle = complex(
        (min(z.real for z in places) + max(z.real for z in places)) / 2,
        (min(z.imag for z in places) + max(z.imag for z in places)) / 2,
    )
    return tuple(
        complex(round(z.real, 5) + 0.0, round(z.imag, 5) + 0.0)
        for z in (place - middle for place in places)
    )


def _turns(
    places: tuple[complex, ...], pairs: tuple[tuple[int, int], ...]
) -> Iterator[complex]:
    angles = {0.0}
    for a, b in pairs:
        angles.add(round(cmath.phase(places[b] - places[a]) % (math.pi / 2), 5))
    if abs(places[0]) > 0.01:
        angles.add(round(cmath.phase(places[0] / 1j) % (math.pi / 2), 5))
    for angle in sorted(angles):
        for quarter in (1, 1j, -1, -1j):
            yield quarter * cmath.exp(-1j * angle)


def uprightness(places: tuple[complex, ...], pairs: tuple[tuple[int, int], ...]) -> float:
    """Return how well positions are turned: the more, the better."""
    steps = [places[b] - places[a] for a, b in pairs]
    level = sum(abs(step.imag) < LEVEL for step in steps)
    upright = sum(abs(step.real) < LEVEL for step in steps)
    top = max(z.imag for z in places)
    highest = [z for z in places if z.imag > top - LEVEL]
    low = min(z.imag for z in places)
    base = [z for z in places if z.imag < low + LEVEL]
    width = max(z.real for z in places) - min(z.real for z in places)
    first_on_top = places[0].imag > top - LEVEL
    leftmost = places[0].real < min(z.real for z in highest) + LEVEL
    return round(
        2.0 * (level + 0.7 * upright) / len(steps)
        + (1.0 if first_on_top else places[0].imag / (top - low) if top > low else 0.0)
        + (0.3 if leftmost else 0.0)
        + (0.4 if len(base) > 1 else 0.0)
        + (0.6 if width > top - low - LEVEL else 0.0)
        + (0.2 if places[1].real > places[0].real + LEVEL else 0.0),
        4,
    )
