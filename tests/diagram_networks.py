"""Networks and a reader of TikZ for the tests of diagrams; shares no code with the drawing."""

from __future__ import annotations

import re
from dataclasses import dataclass, field
from itertools import combinations
from pathlib import Path

from appendix_networks import ALL
from proof_networks import network_on

from symbolic_response.network import Network, read_network, read_network_text
from symbolic_response.topology import Graph

CASES = Path(__file__).parent.parent / "worked_cases"


def two_way(size: int, ends: list[tuple[int, int]]) -> Graph:
    return Graph(size, tuple(ends), (False,) * len(ends))


GRAPHS = {
    "square with chord": two_way(4, [(0, 1), (1, 2), (2, 3), (3, 0), (0, 2)]),
    "K4": two_way(4, list(combinations(range(4), 2))),
    "cube": two_way(8, [(a, b) for a, b in combinations(range(8), 2) if a ^ b in (1, 2, 4)]),
    "ladder": two_way(6, [(0, 1), (1, 2), (3, 4), (4, 5), (0, 3), (1, 4), (2, 5)]),
    "ring": two_way(9, [(k, (k + 1) % 9) for k in range(9)]),
    "K5": two_way(5, list(combinations(range(5), 2))),
    "K33": two_way(6, [(a, b) for a in range(3) for b in range(3, 6)]),
    "pair": two_way(2, [(0, 1)]),
    "dead ends": two_way(7, [(0, 1), (1, 2), (2, 0), (2, 3), (3, 4), (1, 5), (1, 6)]),
}
PLANAR = ("square with chord", "K4", "cube", "ladder", "ring", "pair", "dead ends")


def networks() -> dict[str, Network]:
    found = {name: network_on(graph, name) for name, graph in GRAPHS.items()}
    for case in ("twin_ferry", "stamp_press", "tide_lamp", "dew_valve"):
        found[case] = read_network(CASES / case / "network.toml")
    for name in ("ring", "energy", "one_way", "odd", "numbers", "long_energy"):
        found[f"text {name}"] = read_network_text(ALL[name])
    return found


NUMBER = r"(-?[\d.]+)"
POINT = rf"\({NUMBER},{NUMBER}\)"


@dataclass
class Parsed:
    """What one tikzpicture draws, in pt; ``marks`` are its states, in order of their text."""

    box: tuple[complex, complex]
    lines: list[tuple[str, list[complex]]] = field(default_factory=list)
    circles: list[tuple[str, complex, float]] = field(default_factory=list)
    rectangles: list[tuple[str, complex, complex]] = field(default_factory=list)
    texts: list[tuple[int, complex, str]] = field(default_factory=list)
    marks: list[tuple[str, complex]] = field(default_factory=list)


def points(text: str) -> list[complex]:
    return [complex(float(x), float(y)) for x, y in re.findall(POINT, text)]


def parsed(text: str) -> list[Parsed]:
    """Return the pictures of a text, in order; every line of them must be known."""
    found = []
    for body in re.findall(r"\\begin\{tikzpicture\}\[diagram\]\n(.*?)\\end\{tikzpicture\}", text,
                           re.DOTALL):
        first, *lines = body.splitlines()
        low, high = points(first)
        assert "use as bounding box" in first
        picture = Parsed((low, high))
        for line in lines:
            _line(picture, line)
        found.append(picture)
    return found


def _line(picture: Parsed, line: str) -> None:
    if text := re.fullmatch(rf"\\node\[diagram text (\d+)\] at {POINT} \{{\$(.*)\$\}};", line):
        size, x, y, latex = text.groups()
        picture.texts.append((int(size), complex(float(x), float(y)), latex))
        return
    made = re.fullmatch(r"\\path\[diagram ([a-z ]+)(,rounded corners=[\d.]+pt)?\] (.*);", line)
    assert made, line
    look, _, path = made.groups()
    ends = points(path)
    if radius := re.search(r"circle\[radius=([\d.]+)pt\]", path):
        picture.circles.append((look, ends[0], float(radius[1])))
        picture.marks.append((look, ends[0]))
    elif "rectangle" in path:
        picture.rectangles.append((look, ends[0], ends[1]))
        picture.marks.append((look, (ends[0] + ends[1]) / 2))
    else:
        assert len(ends) == (4 if "controls" in path else 2), line
        picture.lines.append((look, ends))


def along(line: list[complex], number: int = 200) -> list[complex]:
    """Return many points of a straight line or a Bezier curve (Bernstein's polynomials)."""
    degree = len(line) - 1
    weights = {1: (1, 1), 3: (1, 3, 3, 1)}[degree]
    ts = [k / number for k in range(number + 1)]
    return [
        sum(w * (1 - t) ** (degree - i) * t**i * z
            for i, (w, z) in enumerate(zip(weights, line, strict=True)))
        for t in ts
    ]


def ends_of(picture: Parsed, line: list[complex]) -> tuple[int, int]:
    """Return the states that a line of a small picture runs between."""
    def nearest(place: complex) -> int:
        gaps = [abs(place - centre) for _, centre in picture.marks]
        assert min(gaps) < 4.5
        return gaps.index(min(gaps))

    return nearest(line[0]), nearest(line[-1])
