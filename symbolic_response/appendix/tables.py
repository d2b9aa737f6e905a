"""Tables that may cross pages."""

from __future__ import annotations

from collections.abc import Sequence

from symbolic_response.expressions.widths import DISPLAY, TEXT, formula_width

COLUMN_GAP = 12.0
"""Twice LaTeX's tabcolsep, in pt."""


def table(columns: str, head: str, rows: Sequence[str]) -> str:
    """Return a table whose head is repeated on each page."""
    body = " \\\\\n".join(rows)
    return (
        f"\\begin{{longtable}}{{@{{}}{columns}@{{}}}}\n\\toprule\n{head} \\\\\n\\midrule\n"
        f"\\endhead\n{body} \\\\\n\\bottomrule\n\\end{{longtable}}"
    )


def table_width(rows: Sequence[Sequence[str]], *, style: int = TEXT) -> float:
    """Return the width of a table whose cells, the head included, are formulas."""
    columns = list(zip(*rows, strict=True))
    widths = [max(formula_width(cell, style=style) for cell in column) for column in columns]
    return sum(widths) + COLUMN_GAP * (len(widths) - 1)


def wrapping_columns(width: float, fixed: Sequence[Sequence[str]], shares: Sequence[float]) -> str:
    """Return columns whose text wraps, for the room that columns of formulas leave.

    ``fixed``: the rows of those columns, the head included; ``shares``: of the room, by column.
    """
    gaps = COLUMN_GAP * (len(shares) + len(fixed[0]) - 1)
    columns = zip(*fixed, strict=True)
    taken = sum(max(formula_width(cell, style=DISPLAY) for cell in column) for column in columns)
    room = width - gaps - taken
    style = r"\raggedright\arraybackslash\lineskiplimit2pt\lineskip4pt"
    return "".join(f">{{{style}}}p{{{int(room * share)}pt}}" for share in shares)


def digest_latex(digest: str) -> str:
    """Return a digest in hexadecimal digits, in pieces between which a line may end."""
    pieces = [digest[start : start + 16] for start in range(0, len(digest), 16)]
    return r"\allowbreak{}".join(rf"\texttt{{{piece}}}" for piece in pieces)
