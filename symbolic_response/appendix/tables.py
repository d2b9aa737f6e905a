r"""Tables that fit the line and cross pages: columns as wide as their cells, wrapped, or a list.

Cells are LaTeX text with formulas between single ``$``. On a page of one column a table is a
``longtable``; in two columns, where that does not exist, each row is a line of its own with columns
of fixed width. Where wrapped columns would be too narrow the rows become the items of a list.
"""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass

from symbolic_response.appendix.page import Page
from symbolic_response.expressions.widths import (
    DISPLAY,
    TEXT,
    UNKNOWN_WIDTH,
    WORD_SPACE,
    formula_width,
)

COLUMN_GAP = 12.0
"""The space between two columns in pt."""
LEAST = 60.0
"""The least width of a column whose text wraps."""
ABOVE, BELOW = r"\rule{0pt}{3.4ex}", r"\rule[-2.4ex]{0pt}{2.4ex}"
"""Room above and below a fraction in a cell."""
_WRAPPED = r">{\raggedright\arraybackslash\lineskiplimit2pt\lineskip4pt}"
_ALIGNED = {"l": r"\raggedright", "r": r"\raggedleft"}
_SPACE = rf"@{{\hspace{{{COLUMN_GAP:g}pt}}}}"
_PARTS = re.compile(r"\$([^$]*)\$")
_COMMAND = re.compile(r"\\[A-Za-z]+(?:\{\})?|\\(.)")


@dataclass(frozen=True, slots=True)
class Column:
    """A column. ``kind``: ``l``, ``r``, or ``wrap`` where lines may break; ``item``: what stands
    before the cell in a list, None for the head and a space."""

    head: str
    kind: str = "l"
    item: str | None = None


def table(page: Page, columns: Sequence[Column], rows: Sequence[Sequence[str]]) -> str:
    """Return a table, or a list where the line is too narrow for it."""
    every = [[column.head for column in columns], *rows]
    widths = _widths(page.width, columns, every)
    if widths is None:
        return _list(columns, rows)
    if page.columns == 1:
        return _longtable(page.width, columns, widths, every)
    return _lines(page.width, columns, widths, every)


def text_width(text: str) -> float:
    r"""Return about how wide a text with formulas is on one line, never much too small.

    >>> round(text_width("Cycle $c$"))
    32
    """
    total, end = 0.0, 0
    for found in _PARTS.finditer(text):
        total += _words_width(text[end:found.start()])
        formula = found[1]
        style = DISPLAY if formula.startswith(r"\displaystyle") else TEXT
        total += formula_width(formula.removeprefix(r"\displaystyle"), style=style)
        end = found.end()
    return total + _words_width(text[end:])


def _words_width(text: str) -> float:
    plain = _COMMAND.sub(lambda found: found[1] or "", text).replace("~", " ")
    letters = "".join(f"{{{c}}}" if c.isdigit() else c for c in plain if c.isalnum() or c == "-")
    rest = [c for c in plain if not (c.isalnum() or c in "- {}\n")]
    spaces = WORD_SPACE * plain.count(" ")
    return formula_width(rf"\text{{{letters}}}") + spaces + sum(map(_sign_width, rest))


def _sign_width(sign: str) -> float:
    return formula_width(sign) if sign in ",.;:!()[]/=+" else UNKNOWN_WIDTH / 2


def _least(cell: str) -> float:
    """Return the width of the widest part of a cell that stays on one line."""
    pieces = [""]
    for place, part in enumerate(cell.split("$")):
        if place % 2:
            pieces[-1] += f"${part}$"
            continue
        first, *rest = re.split(r"\s|\\allowbreak(?:\{\})?", part)
        pieces[-1] += first
        pieces += rest
    return max(map(text_width, pieces))


def _widths(
    width: float, columns: Sequence[Column], rows: Sequence[Sequence[str]]
) -> list[tuple[float, bool]] | None:
    """Return the width of each column and whether it is to wrap, None where they do not fit."""
    cells = list(zip(*rows, strict=True))
    natural = [max(map(text_width, column)) for column in cells]
    room = width - COLUMN_GAP * (len(columns) - 1)
    if sum(natural) <= room:
        return [(size, False) for size in natural]
    wraps = [place for place, column in enumerate(columns) if column.kind == "wrap"]
    room -= sum(size for place, size in enumerate(natural) if place not in wraps)
    least = {place: max(max(map(_least, cells[place])), min(LEAST, natural[place]))
             for place in wraps}
    if not wraps or sum(least.values()) > room:
        return None
    given = _shared({place: natural[place] for place in wraps}, least, room)
    return [(given.get(place, size), place in wraps) for place, size in enumerate(natural)]


def _shared(
    natural: dict[int, float], least: dict[int, float], room: float
) -> dict[int, float]:
    """Return widths between the least and the natural ones that fill the room, alike in share."""
    low, high = 0.0, 1.0
    for _ in range(30):
        share = (low + high) / 2
        used = sum(max(least[i], min(natural[i], share * room)) for i in natural)
        low, high = (share, high) if used <= room else (low, share)
    return {i: max(least[i], min(natural[i], low * room)) for i in natural}


def _longtable(
    width: float, columns: Sequence[Column], widths: Sequence[tuple[float, bool]],
    rows: Sequence[Sequence[str]],
) -> str:
    spec = _SPACE.join(
        rf"{_WRAPPED}p{{{size / width:.4f}\linewidth}}" if wraps else _kind(column)
        for column, (size, wraps) in zip(columns, widths, strict=True))
    head, *lines = [_row(row) for row in rows]
    body = " \\\\\n".join(lines)
    return (
        f"\\begin{{longtable}}{{@{{}}{spec}@{{}}}}\n\\toprule\n{head} \\\\\n\\midrule\n"
        f"\\endhead\n{body} \\\\\n\\bottomrule\n\\end{{longtable}}"
    )


def _kind(column: Column) -> str:
    return "r" if column.kind == "r" else "l"


def _row(cells: Sequence[str]) -> str:
    return " & ".join(
        f"{ABOVE}{cell}{BELOW}" if r"\displaystyle" in cell and r"\frac" in cell else cell
        for cell in cells)


def _lines(
    width: float, columns: Sequence[Column], widths: Sequence[tuple[float, bool]],
    rows: Sequence[Sequence[str]],
) -> str:
    """Return the rows as tables of one row each, between which a page or column may end."""
    spec = _SPACE.join(
        rf"{_WRAPPED if wraps else ''}p{{{size / width:.4f}\linewidth}}" if wraps
        else rf"w{{{_kind(column)}}}{{{size / width:.4f}\linewidth}}"
        for column, (size, wraps) in zip(columns, widths, strict=True))
    head, *lines = [_row(row) + r" \\" for row in rows]
    first, *rest = lines
    parts = [f"\\toprule\n{head}\n\\midrule\n{first}", *rest]
    parts[-1] += "\n\\bottomrule"
    shown = "\n\\par\\nointerlineskip\\noindent\n".join(
        f"\\begin{{tabular}}{{@{{}}{spec}@{{}}}}\n{part}\n\\end{{tabular}}" for part in parts)
    return f"\\par\\medskip\\noindent\n{shown}\n\\par\\medskip"


def _list(columns: Sequence[Column], rows: Sequence[Sequence[str]]) -> str:
    """Return the rows as items; a row without a first cell continues the item before it."""
    items: list[str] = []
    for first, *rest in rows:
        told = ", ".join(
            (f"{column.head} " if column.item is None else column.item) + cell
            for column, cell in zip(columns[1:], rest, strict=True) if cell)
        if first or not items:
            items.append(f"{first}: {told}")
        else:
            items[-1] += f"; {told}"
    body = ".\n".join(rf"\item {item}" for item in items)
    return f"\\begin{{itemize}}\n{body}.\n\\end{{itemize}}"


def table_width(rows: Sequence[Sequence[str]], *, style: int = TEXT) -> float:
    """Return the width of a table whose cells, the head included, are formulas."""
    columns = list(zip(*rows, strict=True))
    widths = [max(formula_width(cell, style=style) for cell in column) for column in columns]
    return sum(widths) + COLUMN_GAP * (len(widths) - 1)


def digest_latex(digest: str) -> str:
    """Return a digest in hexadecimal digits, in pieces between which a line may end."""
    pieces = [digest[start : start + 16] for start in range(0, len(digest), 16)]
    return r"\allowbreak{}".join(rf"\texttt{{{piece}}}" for piece in pieces)
