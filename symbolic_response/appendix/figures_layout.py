r"""Diagrams set in lines of a float: groups of small pictures, and the float itself.

Lengths are in pt. Pictures keep their size whatever the size of the text is.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from symbolic_response.appendix.page import REVTEX, SCALES, Page
from symbolic_response.appendix.tables import text_width
from symbolic_response.figures.diagrams.pictures import Picture
from symbolic_response.figures.diagrams.tikz import COLUMN_SPACE, ROW_SKIP, tikz_grid

APART, BETWEEN, BESIDE, BELOW = 20.0, 10.0, 6.0, 13.0
"""Space between two groups on a line, between two lines, beside a head, and for a word below."""
PAGE = 550.0
"""About the height of a page; parts of it are what floats may take."""
COLUMN_SEPARATIONS = {True: 18.0, False: 10.0}


@dataclass(frozen=True, slots=True)
class Group:
    """Pictures of one size in rows, what stands before them, and what stands below them."""

    rows: tuple[tuple[Picture, ...], ...]
    head: str
    room: float
    below: str = ""
    below_width: float = 0.0

    @property
    def width(self) -> float:
        """The width, that of the head included."""
        across = len(self.rows[0])
        pictures = across * (self.rows[0][0].box.width + COLUMN_SPACE) - COLUMN_SPACE
        return max(pictures, self.below_width) + self.room

    @property
    def height(self) -> float:
        """The height, that of the words below included."""
        rows = len(self.rows)
        high = rows * (self.rows[0][0].box.height + ROW_SKIP) - ROW_SKIP
        return high + (BELOW if self.below else 0.0)

    @property
    def text(self) -> str:
        """The group as one box."""
        grid = tikz_grid(self.rows)
        if self.below:
            grid = ("\\begin{tabular}{@{}c@{}}\n" + grid
                    + f"\\\\[1pt] \\footnotesize {self.below}\n\\end{{tabular}}%\n")
        head = f"\\makebox[{self.room:.1f}pt][l]{{{self.head}}}" if self.head else ""
        return f"{head}$\\vcenter{{\\hbox{{%\n{grid}}}}}$%\n"


Lines = list[list[Group]]
"""Lines of groups, the first groups of all lines below each other, and so on."""


def group(
    page: Page, pictures: Sequence[Picture], width: float, *, head: str = "", room: float = 0.0,
    below: str = "",
) -> Group:
    """Return pictures in rows no wider than ``width``, nearly alike; the head takes ``room``."""
    size = pictures[0].box.width + COLUMN_SPACE
    most = max(1, int((width - room + COLUMN_SPACE) // size))
    number = -(-len(pictures) // most)
    across = -(-len(pictures) // number)
    rows = tuple(tuple(pictures[start:start + across])
                 for start in range(0, len(pictures), across))
    return Group(rows, head, room, below, printed_width(page, below) if below else 0.0)


def printed_width(page: Page, text: str) -> float:
    """Return the width of a text with formulas at the size of the page."""
    return text_width(text) * SCALES[page.size]


def head_room(page: Page, heads: Sequence[str]) -> float:
    """Return the room that the widest of some heads takes, with the space beside it."""
    return max(printed_width(page, head) for head in heads) + BESIDE


def in_lines(groups: Sequence[Group], width: float) -> Lines:
    """Return groups in lines no wider than ``width``, of nearly the same number where alike."""
    if not groups:
        return []
    widest = max(each.width for each in groups)
    most = max(1, int((width + APART) // (widest + APART)))
    number = -(-len(groups) // most)
    across = -(-len(groups) // number)
    return [list(groups[start:start + across]) for start in range(0, len(groups), across)]


def height(blocks: Sequence[Lines]) -> float:
    """Return the height of blocks of lines of groups."""
    return sum(max(each.height for each in line) + BETWEEN for lines in blocks for line in lines)


def full_width(page: Page) -> float:
    """Return the width of a float across all columns."""
    if page.columns == 1:
        return page.line
    return 2 * page.line + COLUMN_SEPARATIONS[page.document_class == REVTEX]


def _tabular(lines: Lines) -> str:
    """Return lines as a table without rules, or a lone group as it is."""
    if len(lines) == 1 and len(lines[0]) == 1:
        return lines[0][0].text
    across = f"@{{\\hspace{{{APART:g}pt}}}}".join("l" * max(map(len, lines)))
    rows = f"\\\\ \\noalign{{\\vskip {BETWEEN:g}pt}}\n".join(
        "&\n".join(each.text for each in line) for line in lines)
    return (f"{{\\renewcommand{{\\arraystretch}}{{0}}%\n\\begin{{tabular}}{{@{{}}{across}@{{}}}}\n"
            f"{rows}\\end{{tabular}}}}%\n")


def floated(
    page: Page, blocks: Sequence[Lines], caption: str, label: str, wide: bool = False
) -> str:
    r"""Return a figure of blocks below each other; ``wide``: across both columns."""
    body = f"\\par\\vskip{BETWEEN:g}pt\n".join(
        "\\leavevmode\n" + _tabular(lines) for lines in blocks if lines)
    star, place = ("*", "tp") if wide else ("", "!htbp")
    first = _ROOM if page.columns == 1 and page.document_class != REVTEX else ""
    return (f"{first}\\begin{{figure{star}}}[{place}]\n\\centering\n{body}"
            f"\\caption{{{caption}}}\n\\label{{{label}}}\n\\end{{figure{star}}}")


_ROOM = "\\par\\global\\csname @colroom\\endcsname=\\vsize\n"
"""A longtable forgets what room floats above it on the page take, which the next float would
trust; the height of the page is still right then."""
