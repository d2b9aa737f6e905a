r"""Breaking long formulas over lines, with widths computed beforehand.

An :class:`Equation` is a left side and the pieces of its right side; between two pieces a line may
end. :func:`align` sets equations in ``align`` environments, each with its own number, whose lines
fit a given width: `` \notag\\ &\quad{}+`` continues a sum. Breaks minimise the sum over lines of
100 + 50 (slack/limit)^2; the last line leaves room for the number.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from symbolic_response.expressions.latex import SignedTerm, join_factors
from symbolic_response.expressions.loosening import parts_of
from symbolic_response.expressions.tree import Expression
from symbolic_response.expressions.widths import formula_width

NUMBER_ROOM = 30.0
SIGN_WIDTH = 12.23
"""Width of a plus, minus or multiplication sign with the space on both its sides."""
MINUS_WIDTH = 7.78
RELATION_WIDTH = 13.34
INDENT = 10.0
_LINE_COST, _SLACK_COST, _EQUALS_BONUS = 100.0, 50.0, 40.0


@dataclass(frozen=True, slots=True)
class Piece:
    r"""A part of a right side that stays on one line.

    ``sign`` is ``""`` or ``"-"`` for the first piece, then ``"+"``, ``"-"``, ``"="``,
    ``"\\times"``, or ``""`` or ``"\\cdot"`` for a factor, before which a new line has a cross.
    ``forced``: a line ends before this piece in any case.
    """

    sign: str
    body: str
    forced: bool = False


@dataclass(frozen=True, slots=True)
class Equation:
    """One numbered equation; ``relation`` stands between the sides: ``=`` or ``\\le``.

    ``quantities`` and ``meanings``: what the left sides and the right sides stand for, where it is
    known.
    """

    left: str
    pieces: tuple[Piece, ...]
    relation: str = "="
    quantities: tuple[Expression, ...] = ()
    meanings: tuple[Expression, ...] = ()


def sum_pieces(terms: Sequence[SignedTerm]) -> list[Piece]:
    """Return the terms of a sum as pieces."""
    pieces = []
    for place, term in enumerate(terms):
        sign = "-" if term.negative else "+"
        pieces.append(Piece("" if place == 0 and sign == "+" else sign, term.body))
    return pieces or [Piece("", "0")]


def continued(pieces: Sequence[Piece]) -> list[Piece]:
    """Return a right side as it follows another one: behind an equals sign."""
    first, *rest = pieces
    return [Piece("=", ("-" if first.sign == "-" else "") + first.body), *rest]


def line_limit(left: str, width: float) -> float:
    """Return the room that a line of the right side has."""
    return width - (INDENT if is_wide(left, width) else formula_width(left)) - RELATION_WIDTH


def is_wide(left: str, width: float) -> bool:
    """Return whether a left side takes a line of its own."""
    return formula_width(left) > 0.42 * width


def align(equations: Sequence[Equation], width: float) -> str:
    """Return ``align`` environments for equations, in their order.

    Equations whose left sides are alike in width share an environment and thus their alignment.
    """
    blocks: list[list[Equation]] = []
    for equation in equations:
        alone = is_wide(equation.left, width)
        if blocks and not alone and not is_wide(blocks[-1][0].left, width):
            blocks[-1].append(equation)
        else:
            blocks.append([equation])
    return "\n".join(_environment(block, width) for block in blocks)


def _environment(block: Sequence[Equation], width: float) -> str:
    wide = is_wide(block[0].left, width)
    left = INDENT if wide else max(formula_width(e.left) for e in block)
    limit = width - left - RELATION_WIDTH
    rows = ""
    for equation in block:
        row = _rows(equation, limit, wide)
        tall = r"\frac" in row.split("\n", 1)[0] and r"\frac" in rows.rsplit("\n", 1)[-1]
        rows += (" \\\\[3pt]\n" if tall else " \\\\\n") * bool(rows) + row
    return f"\\begin{{align}}\n{rows}\n\\end{{align}}"


def _rows(equation: Equation, limit: float, wide: bool) -> str:
    start = r"&\quad " if wide else "&"
    rows = _left_rows(equation.left, limit + RELATION_WIDTH) if wide else []
    for place, line in enumerate(break_lines(loosened(equation.pieces, limit), limit)):
        first = line[0]
        if place == 0:
            head = ("" if wide else equation.left + " ") + start + equation.relation + first.sign
        elif first.sign == "=":
            head = start + "="
        else:
            head = start + r"\quad{}" + _opening(first.sign)
        rows.append(f"{head} {_joined(line)}")
    return " \\notag\\\\\n".join(rows)


def _left_rows(left: str, room: float) -> list[str]:
    """Return a left side that stands on lines of its own."""
    if formula_width(left) <= room + INDENT:
        return [f"&{left}"]
    first, *rest = break_lines(loosened([Piece("", left)], room), room)
    return [f"&{_joined(first)}"] + [
        r"&\quad{}" + _opening(line[0].sign) + f" {_joined(line)}" for line in rest]


def _opening(sign: str) -> str:
    """Return the sign that a line begins with: a cross within a product."""
    return r"\times" if sign in ("", r"\cdot") else sign


def _joined(line: Sequence[Piece]) -> str:
    first, *rest = line
    return first.body + "".join(f" {piece.sign} {piece.body}" for piece in rest)


def loosened(pieces: Sequence[Piece], limit: float) -> list[Piece]:
    """Return the pieces, those wider than a line taken apart into such that are not."""
    found = []
    room = limit - NUMBER_ROOM - SIGN_WIDTH
    for place, piece in enumerate(pieces):
        if fits(piece.body, limit) or (
            len(pieces) > place + 1 and formula_width(piece.body) <= limit - SIGN_WIDTH
        ):
            found.append(piece)
            continue
        (_, first), *rest = parts_of(piece.body, room, formula_width)
        found.append(Piece(piece.sign, first, piece.forced))
        found += [Piece(sign, body) for sign, body in rest]
    return found


def break_lines(pieces: Sequence[Piece], limit: float) -> list[list[Piece]]:
    """Return the pieces in lines, at the least total cost.

    Lines fit ``limit`` wherever each piece does by itself; a piece that does not gets a line.

    >>> [len(line) for line in break_lines([Piece("", "a + b")] + [Piece("+", "c")] * 9, 80.0)]
    [4, 4, 2]
    """
    widths = [formula_width(piece.body) for piece in pieces]
    count = len(pieces)
    best = [0.0] + [float("inf")] * count
    origin = [0] * (count + 1)
    for end in range(1, count + 1):
        room = limit - (NUMBER_ROOM if end == count else 0.0)
        used = 0.0
        for start in range(end - 1, -1, -1):
            used += widths[start] + _sign_width(pieces[start], start == 0)
            if used > room and start < end - 1:
                break
            cost = best[start] + _line_cost(pieces, start, end, used, room)
            if cost < best[end]:
                best[end], origin[end] = cost, start
            if pieces[start].forced:
                break
    lines, end = [], count
    while end:
        lines.append(list(pieces[origin[end] : end]))
        end = origin[end]
    return lines[::-1]


def _line_cost(
    pieces: Sequence[Piece], start: int, end: int, used: float, room: float
) -> float:
    overfull = 10_000.0 * max(0.0, used - room)
    slack = 0.0 if end == len(pieces) else max(0.0, 1 - used / room)
    bonus = _EQUALS_BONUS if pieces[start].sign == "=" else 0.0
    return _LINE_COST + _SLACK_COST * slack**2 + overfull - bonus


def _sign_width(piece: Piece, first: bool) -> float:
    if first:
        return MINUS_WIDTH if piece.sign == "-" else 0.0
    return RELATION_WIDTH if piece.sign == "=" else SIGN_WIDTH


def product_pieces(factors: Sequence[str], limit: float, sign: str = "") -> list[Piece]:
    """Return a product of printed factors in pieces that fit, a line ending before each."""
    pieces: list[Piece] = []
    line: list[str] = []
    for factor in factors:
        if line and formula_width(join_factors([*line, factor])) > limit - NUMBER_ROOM - SIGN_WIDTH:
            pieces.append(Piece(r"\times" if pieces else sign, join_factors(line), bool(pieces)))
            line = []
        line.append(factor)
    pieces.append(Piece(r"\times" if pieces else sign, join_factors(line), bool(pieces)))
    return pieces


def fits(body: str, limit: float) -> bool:
    """Return whether a piece fits a line whatever follows it."""
    return formula_width(body) <= limit - NUMBER_ROOM - SIGN_WIDTH


__all__ = [
    "Equation", "Piece", "align", "break_lines", "continued", "fits", "is_wide", "line_limit",
    "loosened", "product_pieces", "sum_pieces",
]
