"""The figures of spanning trees, two-tree forests and splittings, as many as have room."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

from symbolic_response.appendix.figures_layout import (
    PAGE,
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
from symbolic_response.errors import SizeLimitError
from symbolic_response.figures.diagrams import Drawing, draw
from symbolic_response.figures.diagrams.pictures import Picture
from symbolic_response.network.quantities import BarrierOf, DriveOf, Probability, Response
from symbolic_response.topology import splittings

LIMIT = 32
"""How many trees towards one state, splittings of a transition or forests are drawn."""
TREES_HEIGHT, FORESTS_HEIGHT, SPLITTINGS_HEIGHT = 0.5 * PAGE, 0.35 * PAGE, 0.48 * PAGE
NARROW_HEIGHT = {ARTICLE: 0.42 * PAGE, REVTEX: 0.6 * PAGE}
"""Above this height in one of two columns a float goes across both."""


@dataclass(frozen=True, slots=True)
class Drawn:
    """The sentence that refers to a float, the float, and whether it goes across both columns."""

    sentence: str = ""
    figure: str = ""
    wide: bool = False


def transition_of(response: Response) -> int:
    assert isinstance(response.perturbation, BarrierOf | DriveOf)
    return response.perturbation.transition


# -- trees -----------------------------------------------------------------------------------------


def trees(paper: Paper, marked: int | None) -> Drawn:
    page, counts = paper.page, paper.analysis.tree_counts
    if not any(counts):
        return Drawn()
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
    return Drawn(f"{which} Fig.~\\ref{{fig:trees}}.",
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


def forests(paper: Paper, responses: Sequence[Response]) -> tuple[Drawn, str]:
    """Return the forests of the first response of a probability, and the letter of their sum."""
    pairs = [(r.quantity.states[0], transition_of(r)) for r in responses
             if isinstance(r.quantity, Probability) and len(r.quantity.states) == 1]
    if not pairs:
        return Drawn(), ""
    state, e = pairs[0]
    labels = f"{paper.notation.states[state]},{paper.notation.transitions[e]}"
    letter = paper.notation.indexed("forest", labels)
    try:
        count = draw(paper.analysis, "forests", root=state, transition=e, limit=0).total
        pictures, wide = _forest_pictures(paper, state, e, count)
    except SizeLimitError:
        return Drawn(f"The forests of ${letter}$ are too many to be drawn."), letter
    width = full_width(paper.page) if wide else paper.page.line
    made = group(paper.page, pictures, width)
    caption = _forest_words(paper, state, e, count, len(pictures), letter)
    figure = floated(paper.page, [[[made]]], caption, "fig:forests", wide)
    return Drawn(f"Figure~\\ref{{fig:forests}} shows the forests of ${letter}$.", figure,
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


# -- splittings ------------------------------------------------------------------------------------


def splitting_sets(paper: Paper, transitions: Sequence[int]) -> Drawn:
    """Return the splittings of the transitions whose responses are asked for."""
    if not transitions:
        return Drawn()
    try:
        counts = {e: len(splittings(paper.analysis.graph, e)) for e in transitions}
    except SizeLimitError:
        return Drawn("The splittings of the transitions are too many to be drawn.")
    for limit in (LIMIT, 0):
        for number in range(len(transitions), 0, -1):
            for wide in (False, True) if paper.page.columns == 2 else (False,):
                blocks = _splitting_lines(paper, transitions[:number], counts, limit, wide)
                if height(blocks) <= min(SPLITTINGS_HEIGHT, _most(paper.page, wide)):
                    return _splitting_float(paper, blocks, counts, transitions[:number], wide)
    return Drawn("The splittings of the transitions are too large to be drawn.")


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
) -> Drawn:
    labels = [f"${label}$" for label in paper.notation.transitions]
    total = [f"{counts[e]:,} of {labels[e]}" for e in kept]
    caption = ("Splittings: sets $S$ of states (filled), connected like the rest, with the first "
               f"state of a transition (thick, dashed, red) and not its second; {_and(total)}. "
               "Dotted: the other transitions between $S$ and the rest.")
    left_out = [e for e in counts if e not in kept]
    if left_out:
        caption += " Not drawn: " + _and([f"{counts[e]:,} of {labels[e]}" for e in left_out]) + "."
    return Drawn("The splittings are drawn in Fig.~\\ref{fig:splittings}.",
                  floated(paper.page, blocks, caption, "fig:splittings", wide), wide)
