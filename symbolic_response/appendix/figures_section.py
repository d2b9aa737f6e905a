r"""The diagrams of a document: the network and its cycles, trees, splittings, forests.

Each is a float with a sentence that refers to it, to be put behind the section it belongs to; what
is too large to be drawn is left out with a sentence. All together take about two pages at the most.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

from symbolic_response.appendix.cycles_section import listed_cycles
from symbolic_response.appendix.figures_layout import (
    PAGE,
    Group,
    Lines,
    floated,
    full_width,
    group,
    head_room,
    height,
    in_lines,
)
from symbolic_response.appendix.formulas import divided, filled
from symbolic_response.appendix.page import ARTICLE, REVTEX, Page
from symbolic_response.appendix.paper import Paper
from symbolic_response.appendix.results import HEADINGS
from symbolic_response.errors import SizeLimitError
from symbolic_response.expressions.tree import Expression
from symbolic_response.figures.diagrams import PREAMBLE, Drawing, draw
from symbolic_response.figures.diagrams.layout import positions
from symbolic_response.figures.diagrams.pictures import Picture
from symbolic_response.figures.diagrams.small import alike, small
from symbolic_response.network.quantities import (
    BarrierOf,
    DriveOf,
    Probability,
    Response,
    walk_quantity,
)
from symbolic_response.topology import splittings

MAX_STATES = 32
LIMIT = 32
"""How many trees towards one state, splittings of a transition or forests are drawn."""
CYCLES_HEIGHT, TREES_HEIGHT = 0.56 * PAGE, 0.5 * PAGE
FORESTS_HEIGHT, SPLITTINGS_HEIGHT = 0.35 * PAGE, 0.48 * PAGE
NARROW_HEIGHT = {ARTICLE: 0.42 * PAGE, REVTEX: 0.6 * PAGE}
"""Above this height in one of two columns a float goes across both."""
TALLER = 1.2
"""How much taller than the network cycles beside it may be."""
LOADED, STYLES = PREAMBLE.split("\\tikzset", 1)
"""What the preamble loads for diagrams, and the styles, which may stand in the text."""
STYLES = "\\tikzset" + STYLES
FLUSHED = ("\\par\\makeatletter\\ifx\\@deferlist\\@empty\\else\\clearpage\\fi\\makeatother\n")
"""Figures that wait for a page come before what follows."""


@dataclass(frozen=True, slots=True)
class _Drawn:
    """The sentence that refers to a float, the float, and whether it goes across both columns."""

    sentence: str = ""
    figure: str = ""
    wide: bool = False


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
    marked = _transition(responses[0]) if responses else None
    chosen = list(dict.fromkeys(map(_transition, responses)))
    forests, forest_sum = _forests(paper, responses)
    drawn = [_network(paper), _trees(paper, marked), forests, _splittings(paper, chosen)]
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


def _transition(response: Response) -> int:
    assert isinstance(response.perturbation, BarrierOf | DriveOf)
    return response.perturbation.transition


# -- the network and its cycles --------------------------------------------------------------------


def _network(paper: Paper) -> _Drawn:
    pictures = _cycle_pictures(paper)
    for wide in (False, True) if paper.page.columns == 2 else (False,):
        drawing, shown, made = _network_in(paper, pictures, wide)
        if drawing.rates != "none" and shown == len(pictures):
            break
    if not made:
        return _Drawn("The network is too large for a diagram.")
    words = _rate_words(paper, drawing)
    if not pictures:
        return _Drawn("Figure~\\ref{fig:network} shows the network.",
                      floated(paper.page, made, f"The network {words}.", "fig:network", wide), wide)
    what = "its cycle" if len(pictures) == 1 else "its cycles"
    caption = f"(a) The network {words}. (b) {_cycle_words(paper, shown)}"
    return _Drawn(f"Figure~\\ref{{fig:network}} shows the network and {what}.",
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


# -- trees -----------------------------------------------------------------------------------------


def _trees(paper: Paper, marked: int | None) -> _Drawn:
    page, counts = paper.page, paper.analysis.tree_counts
    if not any(counts):
        return _Drawn()
    roots = [k for k, count in enumerate(counts) if count]
    whole = [k for k in roots if counts[k] <= LIMIT]
    lines, wide = _tree_lines(paper, roots, whole, marked), False
    while height(lines[wide]) > _most(page, wide):
        if page.columns == 2 and not wide:
            wide = True
        elif whole:
            whole = whole[:1] if len(whole) > 1 else []
            lines, wide = _tree_lines(paper, roots, whole, marked), False
        else:
            roots = roots[:-1]
            lines = _tree_lines(paper, roots, whole, marked)
    caption = _tree_words(paper, roots, whole, marked)
    which = "The trees are those of" if len(whole) == len(counts) else (
        "Some of the trees are drawn in")
    return _Drawn(f"{which} Fig.~\\ref{{fig:trees}}.",
                  floated(page, lines[wide], caption, "fig:trees", wide), wide)


def _most(page: Page, wide: bool) -> float:
    """Return how high a float may be."""
    return NARROW_HEIGHT[page.document_class] if page.columns == 2 and not wide else TREES_HEIGHT


def _tree_lines(
    paper: Paper, roots: Sequence[int], whole: Sequence[int], marked: int | None
) -> tuple[list[Lines], list[Lines]]:
    """Return the trees in lines of a column and in lines across all columns."""
    page, states = paper.page, paper.notation.states
    counts = paper.analysis.tree_counts
    room = head_room(page, [f"${states[k]}$" for k in roots])
    drawn = {k: _pictures(draw(paper.analysis, "trees", root=k, transition=marked,
                               limit=LIMIT if k in whole else 0)) for k in roots}
    made = []
    for width in (page.line, full_width(page)):
        groups = [group(page, drawn[k], width, head=f"${states[k]}$", room=room) for k in whole]
        examples = [group(page, drawn[k], width, below=f"${states[k]}$: 1 of {counts[k]:,}")
                    for k in roots if k not in whole]
        made.append([in_lines(groups, width), in_lines(examples, width)])
    return made[0], made[1]


def _pictures(drawing: Drawing) -> list[Picture]:
    return [picture for row in drawing.rows for picture in row]


def _tree_words(
    paper: Paper, roots: Sequence[int], whole: Sequence[int], marked: int | None
) -> str:
    counts, states = paper.analysis.tree_counts, paper.notation.states
    text = "Spanning trees directed towards their root, the open circle: "
    if whole:
        numbers = {counts[k] for k in whole}
        each = "each of " if len(whole) > 1 and len(numbers) == 1 else ""
        named = _and([f"${states[k]}$" for k in whole])
        total = f"{counts[whole[0]]}" if len(numbers) == 1 else _and(
            [f"{counts[k]}" for k in whole])
        text += f"the {total} towards {each}{named}"
    if len(whole) < len(roots):
        text += ("; " if whole else "") + "one towards each " + (
            "other state" if whole else "state")
        if len(roots) < sum(1 for count in counts if count):
            text += f" of the first {len(roots)}"
        text += ", with their number"
    text += "."
    if marked is not None:
        text += (f" Thick and dashed: transition ${paper.notation.transitions[marked]}$, red in "
                 "trees that use it, grey in others.")
    return text


def _and(items: Sequence[str]) -> str:
    return items[0] if len(items) == 1 else ", ".join(items[:-1]) + " and " + items[-1]


# -- forests ---------------------------------------------------------------------------------------


def _forests(paper: Paper, responses: Sequence[Response]) -> tuple[_Drawn, str]:
    """Return the forests of the first response of a probability, and the letter of their sum."""
    pairs = [(r.quantity.states[0], _transition(r)) for r in responses
             if isinstance(r.quantity, Probability) and len(r.quantity.states) == 1]
    if not pairs:
        return _Drawn(), ""
    state, e = pairs[0]
    labels = f"{paper.notation.states[state]},{paper.notation.transitions[e]}"
    letter = paper.notation.indexed("forest", labels)
    try:
        count = draw(paper.analysis, "forests", root=state, transition=e, limit=0).total
        pictures, wide = _forest_pictures(paper, state, e, count)
    except SizeLimitError:
        return _Drawn(f"The forests of ${letter}$ are too many to be drawn."), letter
    width = full_width(paper.page) if wide else paper.page.line
    made = group(paper.page, pictures, width)
    caption = _forest_words(paper, state, e, count, len(pictures), letter)
    figure = floated(paper.page, [[[made]]], caption, "fig:forests", wide)
    return _Drawn(f"Figure~\\ref{{fig:forests}} shows the forests of ${letter}$.", figure,
                  wide), letter


def _forest_words(
    paper: Paper, state: int, e: int, count: int, shown: int, letter: str
) -> str:
    which = "The spanning forest" if count == 1 else f"The {count:,} spanning forests"
    if shown < count:
        which = f"One of the {count:,} spanning forests"
    root, transition = paper.notation.states[state], paper.notation.transitions[e]
    return (f"{which} of two trees in ${letter}${filled(paper, divided(paper))}, with "
            f"{'its sign' if shown == 1 else 'their signs'}. Open circle: the root "
            f"${root}$; open square: the other root; dashed grey: transition ${transition}$, "
            "which no forest uses.")


def _forest_pictures(
    paper: Paper, state: int, e: int, count: int
) -> tuple[list[Picture], bool]:
    """Return all forests where they have room, else one; and whether across both columns."""
    page = paper.page
    every = _pictures(draw(paper.analysis, "forests", root=state, transition=e,
                           limit=LIMIT if count <= LIMIT else 0))
    for wide in (False, True):
        width = full_width(page) if wide else page.line
        most = min(FORESTS_HEIGHT, _most(page, wide))
        if height([[[group(page, every, width)]]]) <= most:
            return every, wide and page.columns == 2
    return _pictures(draw(paper.analysis, "forests", root=state, transition=e, limit=0)), False


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


# -- splittings ------------------------------------------------------------------------------------


def _splittings(paper: Paper, transitions: Sequence[int]) -> _Drawn:
    """Return the splittings of the transitions whose responses are asked for."""
    if not transitions:
        return _Drawn()
    try:
        counts = {e: len(splittings(paper.analysis.graph, e)) for e in transitions}
    except SizeLimitError:
        return _Drawn("The splittings of the transitions are too many to be drawn.")
    for limit in (LIMIT, 0):
        for number in range(len(transitions), 0, -1):
            for wide in (False, True) if paper.page.columns == 2 else (False,):
                blocks = _splitting_lines(paper, transitions[:number], counts, limit, wide)
                if height(blocks) <= min(SPLITTINGS_HEIGHT, _most(paper.page, wide)):
                    return _splitting_float(paper, blocks, counts, transitions[:number], wide)
    return _Drawn("The splittings of the transitions are too large to be drawn.")


def _splitting_lines(
    paper: Paper, transitions: Sequence[int], counts: Mapping[int, int], limit: int, wide: bool
) -> list[Lines]:
    """Return all splittings of transitions that have no more than a limit, else an example."""
    page = paper.page
    heads = {e: f"${paper.notation.transitions[e]}$" for e in transitions}
    room = head_room(page, list(heads.values()))
    width = full_width(page) if wide else page.line
    return [in_lines([
        group(page, _pictures(draw(paper.analysis, "splittings", transition=e, limit=limit)), width,
              head=head, room=room, below=f"1 of {counts[e]:,}" if counts[e] > limit else "")
        for e, head in heads.items()
    ], width)]


def _splitting_float(
    paper: Paper, blocks: Sequence[Lines], counts: Mapping[int, int], kept: Sequence[int],
    wide: bool,
) -> _Drawn:
    labels = [f"${label}$" for label in paper.notation.transitions]
    total = [f"{counts[e]:,} of {labels[e]}" for e in kept]
    caption = ("Splittings: sets $S$ of states (filled), connected like the rest, with the first "
               f"state of a transition (thick, dashed, red) and not its second; {_and(total)}. "
               "Dotted: the other transitions between $S$ and the rest.")
    left_out = [e for e in counts if e not in kept]
    if left_out:
        caption += " Not drawn: " + _and([f"{counts[e]:,} of {labels[e]}" for e in left_out]) + "."
    return _Drawn("The splittings are drawn in Fig.~\\ref{fig:splittings}.",
                  floated(paper.page, blocks, caption, "fig:splittings", wide), wide)
