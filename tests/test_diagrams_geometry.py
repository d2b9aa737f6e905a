"""Pictures of networks: nothing overlaps, plane graphs have no crossing, the same every time."""

from __future__ import annotations

import os
import re
import subprocess
import sys
from itertools import combinations
from pathlib import Path

import pytest
from diagram_networks import GRAPHS, PLANAR, Parsed, along, networks, parsed

from symbolic_response.expressions.latex import expression_latex
from symbolic_response.figures.diagrams import draw
from symbolic_response.figures.diagrams.labels import label
from symbolic_response.figures.diagrams.layout import positions
from symbolic_response.response.notation import notation_of

NETWORKS = networks()


def rectangle(size: int, place: complex, latex: str) -> tuple[float, float, float, float]:
    """The room of a label on the page: left, bottom, right, top."""
    made = label(latex, size)
    return (place.real - made.width / 2, place.imag - made.depth,
            place.real + made.width / 2, place.imag + made.height)


def inside(room: tuple[float, float, float, float], place: complex, margin: float = 0.0) -> bool:
    left, bottom, right, top = room
    return (left - margin < place.real < right + margin
            and bottom - margin < place.imag < top + margin)


def overlap(one: tuple[float, ...], two: tuple[float, ...]) -> bool:
    wide = min(one[2], two[2]) - max(one[0], two[0])
    tall = min(one[3], two[3]) - max(one[1], two[1])
    return wide > 0 and tall > 0


@pytest.mark.parametrize("name", NETWORKS)
def test_labels_overlap_nothing(name: str) -> None:
    drawing = draw(NETWORKS[name])
    (picture,) = parsed(drawing.text)
    assert drawing.rates != "none"
    count = len(NETWORKS[name].states)
    rooms = [rectangle(*text) for text in picture.texts]
    rates = rooms[count:]
    assert len(rates) == sum(2 - (t.backward is None) for t in NETWORKS[name].transitions)
    assert not any(overlap(a, b) for a, b in combinations(rooms, 2))
    for _, line in picture.lines:
        assert not any(inside(room, z, 0.5) for room in rates for z in along(line))
    for _, centre, radius in picture.circles:
        for room in rates:
            nearest = complex(min(max(centre.real, room[0]), room[2]),
                              min(max(centre.imag, room[1]), room[3]))
            assert abs(nearest - centre) > radius
    for _, low, high in picture.rectangles:
        assert not any(overlap((low.real, low.imag, high.real, high.imag), r) for r in rates)
    box = (picture.box[0].real, picture.box[0].imag, picture.box[1].real, picture.box[1].imag)
    assert all(inside(box, complex(*corner), 0.01) for r in rooms for corner in (r[:2], r[2:]))


@pytest.mark.parametrize("name", NETWORKS)
def test_lines_avoid_the_states_and_end_beside_their_own(name: str) -> None:
    network = NETWORKS[name]
    (picture,) = parsed(draw(network).text)
    centres = [place for _, place in picture.marks]
    assert len(centres) == len(network.states)
    wanted = [(t.first, t.second, t.backward is None) for t in network.transitions]
    wanted += [(t.second, t.first, False) for t in network.transitions if t.backward is not None]
    drawn = []
    for look, line in picture.lines:
        found = [nearest_state(picture, z) for z in (line[0], line[-1])]
        assert all(0 < gap(picture, k, z) < 2
                   for k, z in zip(found, (line[0], line[-1]), strict=True))
        drawn.append((found[0], found[1], look == "step"))
        assert all(gap(picture, k, z) > 0.4 for k in range(len(centres)) for z in along(line))
    assert sorted(drawn) == sorted(wanted)


def nearest_state(picture: Parsed, place: complex) -> int:
    return min(range(len(picture.marks)), key=lambda k: gap(picture, k, place))


def gap(picture: Parsed, state: int, place: complex) -> float:
    """How far a point is from the outline of a state; boxes have round corners of 4 pt."""
    _, centre = picture.marks[state]
    for _, middle, radius in picture.circles:
        if middle == centre:
            return abs(place - centre) - radius
    for _, low, high in picture.rectangles:
        if (low + high) / 2 == centre:
            nearest = complex(min(max(place.real, low.real + 4), high.real - 4),
                              min(max(place.imag, low.imag + 4), high.imag - 4))
            return abs(place - nearest) - 4
    raise AssertionError(centre)


def test_every_rate_stands_to_the_left_of_its_own_line() -> None:
    for name in ("K4", "cube", "tide_lamp"):
        network = NETWORKS[name]
        (picture,) = parsed(draw(network, expressions=True).text)
        symbols = notation_of(network).symbols
        texts = {latex: place for size, place, latex in picture.texts if size == 8}
        centres = [place for _, place in picture.marks]
        for t in network.transitions:
            for rate, a, b in ((t.forward, t.first, t.second), (t.backward, t.second, t.first)):
                assert rate is not None
                place = texts[expression_latex(rate, symbols)]
                turn = ((centres[b] - centres[a]).conjugate() * (place + 2j - centres[a])).imag
                assert turn > 0


@pytest.mark.parametrize("name", PLANAR)
def test_plane_graphs_are_drawn_without_crossings(name: str) -> None:
    graph = GRAPHS[name]
    places = [(round(z.real * 1e5), round(z.imag * 1e5)) for z in positions(graph)]

    def turn(a: int, b: int, c: int) -> int:
        (ax, ay), (bx, by), (cx, cy) = places[a], places[b], places[c]
        value = (bx - ax) * (cy - ay) - (by - ay) * (cx - ax)
        return (value > 0) - (value < 0)

    for (a, b), (c, d) in combinations(graph.ends, 2):
        if len({a, b, c, d}) == 4:
            assert turn(a, b, c) == turn(a, b, d) or turn(c, d, a) == turn(c, d, b)


@pytest.mark.parametrize("name", GRAPHS)
def test_first_state_is_on_top_and_states_are_apart(name: str) -> None:
    places = positions(GRAPHS[name])
    if name not in ("dead ends",):
        assert places[0].imag >= max(z.imag for z in places) - 1e-4
    assert min(abs(a - b) for a, b in combinations(places, 2)) > 0.5


def test_known_shapes() -> None:
    ring = positions(GRAPHS["ring"])
    assert len({round(abs(z - sum(ring) / 9), 3) for z in ring}) == 1
    square = positions(GRAPHS["square with chord"])
    assert len({round(z.real, 4) for z in square}) == len({round(z.imag, 4) for z in square}) == 2
    ladder = positions(GRAPHS["ladder"])
    assert sorted(len({round(v, 4) for v in values}) for values in (
        [z.real for z in ladder], [z.imag for z in ladder])) == [2, 3]


def test_wide_pictures_lose_expressions_then_letters() -> None:
    k5 = NETWORKS["K5"]
    assert draw(k5, width=345).rates == "expressions"
    assert draw(k5, width=60).rates == "none"
    narrow = draw(k5, width=246)
    assert narrow.width <= 246


def test_long_expressions_fall_back_to_letters() -> None:
    assert draw(NETWORKS["twin_ferry"]).letters == (0, 1, 2, 3)
    assert draw(NETWORKS["text one_way"]).letters == (0,)
    assert draw(NETWORKS["tide_lamp"]).letters == ()
    ferry = draw(NETWORKS["twin_ferry"]).text
    assert r"w^{+}_{\mathrm{ferry}}" in ferry and "e^{" not in ferry
    rates = draw(NETWORKS["tide_lamp"]).text
    assert "$a c$" in rates
    letters = draw(NETWORKS["tide_lamp"], letters="generator", expressions=False).text
    assert "$W_{pi}$" in letters and "$a c$" not in letters


def test_the_same_text_in_every_process() -> None:
    code = ("import sys\nfrom diagram_networks import networks\n"
            "from symbolic_response.figures.diagrams import draw\n"
            "made = networks()\n"
            "for name in ('cube', 'dead ends', 'twin_ferry'):\n"
            "    print(draw(made[name]).text, draw(made[name]).svg)\n")
    runs = [
        subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True,
                       cwd=Path(__file__).parent, env={**os.environ, "PYTHONHASHSEED": seed,
                       "PYTHONPATH": os.pathsep.join([str(Path(__file__).parent.parent), "."])})
        for seed in ("1", "2")
    ]
    assert runs[0].stdout == runs[1].stdout and len(runs[0].stdout) > 5000


def test_labels_are_no_larger_in_tex(requires_latex: None, tmp_path: Path) -> None:
    texts = sorted({
        (size, latex) for network in NETWORKS.values()
        for size, _, latex in parsed(draw(network).text)[0].texts
    } | {(7, "W_{20,19}"), (7, "W_{21}"), (8, r"\gamma"), (10, r"\hat{k}_{+1}"),
         (8, r"\mathrm{loaded}"), (8, r"w^{-}_{AB}"), (8, "k_{b} - k_{a}^2")})
    boxes = "\n".join(
        rf"\setbox0\hbox{{\fontsize{{{size}}}{{12}}\selectfont${latex}$}}"
        r"\immediate\write\sizes{\the\wd0 \space\the\ht0 \space\the\dp0}" for size, latex in texts
    )
    (tmp_path / "m.tex").write_text(
        "\\documentclass{article}\\usepackage{amsmath,amssymb}\\newwrite\\sizes"
        "\\immediate\\openout\\sizes=m.out\n\\begin{document}\n" + boxes + "\n\\end{document}\n")
    subprocess.run(["pdflatex", "-interaction=batchmode", "m.tex"], cwd=tmp_path, check=True,
                   capture_output=True, timeout=60)
    lines = (tmp_path / "m.out").read_text().splitlines()
    for (size, latex), line in zip(texts, lines, strict=True):
        width, height, depth = (float(x) for x in re.findall(r"[\d.]+", line))
        made = label(latex, size)
        assert width <= made.width + 0.1, (latex, size)
        assert width >= 0.85 * made.width, (latex, size)
        assert height <= made.height + 0.7, (latex, height, made.height)
        assert depth <= made.depth + 0.7, (latex, depth, made.depth)
