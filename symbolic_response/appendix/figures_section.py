r"""The diagrams of a document: the network and its cycles, trees, splittings, forests.

Each is a float with a sentence that refers to it, to be put behind the section it belongs to; what
is too large to be drawn is left out with a sentence. All together take about two pages at the most.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from symbolic_response.appendix.cycles_section import listed_cycles
from symbolic_response.appendix.figures_grids import (
    Drawn,
    forests,
    splitting_sets,
    transition_of,
    trees,
)
from symbolic_response.appendix.figures_layout import (
    PAGE,
    Group,
    Lines,
    floated,
    full_width,
    group,
    head_room,
)
from symbolic_response.appendix.paper import Paper
from symbolic_response.appendix.results import HEADINGS
from symbolic_response.expressions.tree import Expression
from symbolic_response.figures.diagrams import PREAMBLE, Drawing, draw
from symbolic_response.figures.diagrams.layout import positions
from symbolic_response.figures.diagrams.pictures import Picture
from symbolic_response.figures.diagrams.small import alike, small
from symbolic_response.network.quantities import (
    BarrierOf,
    DriveOf,
    Response,
    walk_quantity,
)

MAX_STATES = 32
CYCLES_HEIGHT = 0.56 * PAGE
TALLER = 1.2
"""How much taller than the network cycles beside it may be."""
LOADED, STYLES = PREAMBLE.split("\\tikzset", 1)
"""What the preamble loads for diagrams, and the styles, which may stand in the text."""
STYLES = "\\tikzset" + STYLES
FLUSHED = "\\par\\makeatletter\\ifx\\@deferlist\\@empty\\else\\clearpage\\fi\\makeatother\n"
"""Figures that wait for a page come before what follows."""


@dataclass(frozen=True, slots=True)
class Diagrams:
    """The text of each diagram, to be put behind a section; empty for none.

    A float across both columns, which comes on a later page, stands with the diagram before it.
    ``forest_sum`` is how the sum of the forests is printed.
    """

    network: str = ""
    trees: str = ""
    forests: str = ""
    splittings: str = ""
    forest_sum: str = ""


def diagrams(paper: Paper, quantities: Sequence[Expression]) -> Diagrams:
    """Return the diagrams of a document that prints some quantities."""
    network = paper.network
    if len(network.states) > MAX_STATES:
        return Diagrams(f"The network, with its {len(network.states)} states, is too large for"
                        " diagrams.")
    responses = _responses(quantities)
    marked = transition_of(responses[0]) if responses else None
    chosen = list(dict.fromkeys(map(transition_of, responses)))
    two_trees, forest_sum = forests(paper, responses)
    drawn = [_network(paper), trees(paper, marked), two_trees, splitting_sets(paper, chosen)]
    texts = ["", "", "", ""]
    for place, each in enumerate(drawn):
        texts[place] += each.sentence
        early = each.wide and place > 0 and bool(drawn[place - 1].sentence)
        texts[place - 1 if early else place] += f"\n{each.figure}" if each.figure else ""
    return Diagrams(texts[0], texts[1], texts[2], texts[3], forest_sum)


def _responses(quantities: Sequence[Expression]) -> list[Response]:
    """Return the responses to one barrier or drive, in their order."""
    return [part for quantity in quantities for part in walk_quantity(quantity)
            if isinstance(part, Response) and isinstance(part.perturbation, BarrierOf | DriveOf)]


# -- the network and its cycles --------------------------------------------------------------------


def _network(paper: Paper) -> Drawn:
    pictures = _cycle_pictures(paper)
    for wide in (False, True) if paper.page.columns == 2 else (False,):
        drawing, shown, made = _network_in(paper, pictures, wide)
        if drawing.rates != "none" and shown == len(pictures):
            break
    if not made:
        return Drawn("The network is too large for a diagram.")
    words = _rate_words(paper, drawing)
    if not pictures:
        return Drawn("Figure~\\ref{fig:network} shows the network.",
                     floated(paper.page, made, f"The network {words}.", "fig:network", wide), wide)
    what = "its cycle" if len(pictures) == 1 else "its cycles"
    caption = f"(a) The network {words}. (b) {_cycle_words(paper, shown)}"
    return Drawn(f"Figure~\\ref{{fig:network}} shows the network and {what}.",
                 floated(paper.page, made, caption, "fig:network", wide), wide)


def _network_in(
    paper: Paper, pictures: Sequence[Picture], wide: bool
) -> tuple[Drawing, int, list[Lines]]:
    """Return the network, how many cycles are shown, and both in lines; none if it is too wide."""
    page = paper.page
    width = full_width(page) if wide else page.line
    room = head_room(page, ["(a)", "(b)"]) if pictures else 0.0
    drawing = draw(paper.analysis, width=width - room, letters="rate", notation=paper.notation)
    if drawing.width > width - room:
        return drawing, 0, []
    made = group(page, drawing.rows[0], width, head="(a)" if pictures else "", room=room)
    if not pictures:
        return drawing, 0, [[[made]]]
    lines, shown = _with_cycles(paper, made, pictures, width, room)
    return drawing, shown, lines


def _rate_words(paper: Paper, drawing: Drawing) -> str:
    if drawing.rates == "none":
        two_way = all(t.backward is not None for t in paper.network.transitions)
        return "without its rates" + ("" if two_way else "; full arrow heads are one-way")
    if not drawing.letters:
        return "with its rates"
    rate = paper.letters["rate"]
    if paper.notation.indices != "transition":
        return "with its rates" if len(drawing.letters) < len(
            paper.network.transitions) else "with the letters of its rates"
    return rf"with its rates, ${rate}^{{\pm}}_e$ as listed in the text"


def _cycle_pictures(paper: Paper) -> tuple[Picture, ...]:
    """Return the listed cycles in order, each with the letter of its force."""
    listed = listed_cycles(paper)[0]
    base = small(paper.analysis.graph, positions(paper.analysis.graph))
    letter = paper.letters["force"]
    return alike(base.cycle(cycle, f"{letter}_{{{number}}}")
                 for number, cycle in enumerate(listed, start=1)) if listed else ()


def _with_cycles(
    paper: Paper, network: Group, pictures: Sequence[Picture], width: float, room: float
) -> tuple[list[Lines], int]:
    """Return the network and its cycles, side by side where that is not too tall, and how many."""
    beside = width - network.width - 1.5 * room
    if beside > room + pictures[0].box.width:
        made = group(paper.page, pictures, beside, head="(b)", room=room)
        if made.height <= TALLER * network.height:
            return [[[network, made]]], len(pictures)
    shown = len(pictures)
    while True:
        made = group(paper.page, pictures[:shown], width, head="(b)", room=room)
        if made.height <= CYCLES_HEIGHT or len(made.rows) == 1:
            return [[[network]], [[made]]], shown
        shown -= 1


def _cycle_words(paper: Paper, shown: int) -> str:
    listed, every = listed_cycles(paper)
    force = rf"${paper.letters['force']}_c$"
    if len(listed) == 1 and every == "1":
        return f"Its cycle, in the orientation of its force ${paper.letters['force']}_1$."
    if every == f"{len(listed)}":
        which = f"Its {len(listed)} cycles" if shown == len(listed) else (
            f"The first {shown} of its {len(listed)} cycles")
    elif shown == len(listed):
        which = f"The {len(listed)} fundamental cycles of the list, of {every},"
    else:
        which = f"The first {shown} of the {len(listed)} fundamental cycles of the list"
    return f"{which} in the orientation of their forces {force}."


# -- where they stand ------------------------------------------------------------------------------


def behind(results: str, drawn: Diagrams) -> str:
    """Return the results with the forests behind the first subsection that prints their sum.

    Where it is not printed by its letter, behind the first responses to barriers or drives.
    """
    places = [results.find(drawn.forest_sum)] if drawn.forest_sum else []
    places += sorted(results.find(rf"\subsection*{{{HEADINGS[kind]}}}")
                     for kind in ("barrier", "drive"))
    found = [place for place in places if place >= 0]
    end = results.find("\n\n\\subsection*", found[0]) if found else -1
    parts = (results, drawn.forests) if end < 0 else (
        results[:end], drawn.forests, results[end:].lstrip("\n"))
    return "\n\n".join(part for part in parts if part)
