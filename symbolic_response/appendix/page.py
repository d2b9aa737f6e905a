r"""The page a document is made for: class, columns, size, and the width of a line, as data.

Widths are those of ``\columnwidth`` in TeX. Formulas are measured as at 10 pt, so that what counts
for breaking a line is its width over the scale of the glyphs: the most that letters grow from 10 to
11 and 12 pt, 1.095 and 1.175. (Letters with scripts grow less, by 1.07 and 1.10 in all, so that
lines end a little early there.) ``tests/test_appendix_classes.py`` measures both anew.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TypeVar

from symbolic_response.errors import NetworkError
from symbolic_response.network.model import Network

Value = TypeVar("Value", str, int)
ARTICLE, REVTEX = "article", "revtex"
CLASSES, COLUMNS, SIZES = (ARTICLE, REVTEX), (1, 2), (10, 11, 12)
LINES = {
    (ARTICLE, 1, 10): 345.0, (ARTICLE, 1, 11): 360.0, (ARTICLE, 1, 12): 390.0,
    (ARTICLE, 2, 10): 229.5, (ARTICLE, 2, 11): 229.5, (ARTICLE, 2, 12): 229.5,
    (REVTEX, 1, 10): 510.0, (REVTEX, 2, 10): 246.0,
}
SCALES = {10: 1.0, 11: 1.095, 12: 1.175}
KEYS = ("class", "columns", "size", "fragment", "bibtex")
_PREFIX = "write letters, digits, - and _ only"


@dataclass(frozen=True, slots=True)
class Page:
    """A page: ``line`` is the width of a line of text in pt."""

    document_class: str = ARTICLE
    columns: int = 1
    size: int = 10
    line: float = LINES[ARTICLE, 1, 10]

    @property
    def width(self) -> float:
        """The width of a line in the pt of formulas measured at 10 pt."""
        return self.line / SCALES[self.size]

    @property
    def own_width(self) -> bool:
        """Whether the line is not as wide as the class makes it."""
        return self.line != LINES[self.document_class, self.columns, self.size]


@dataclass(frozen=True, slots=True)
class Layout:
    r"""What is asked of the form of a document; None: what the file says, else the default.

    ``document_class``: ``article`` or ``revtex``; ``columns``: 1 or 2; ``size``: 10, 11 or 12 pt,
    for article; ``width``: of a line, in pt, where it is not that of the class. ``fragment``: a
    file to ``\input``, without a preamble; ``prefix``: before the names of its labels, citations
    and theorems; ``bibtex``: whether the sources are written as a BibTeX file too.
    """

    document_class: str | None = None
    columns: int | None = None
    size: int | None = None
    width: float | None = None
    fragment: bool | None = None
    prefix: str | None = None
    bibtex: bool | None = None


DEFAULT = Layout()


@dataclass(frozen=True, slots=True)
class Settings:
    """The form of a document, decided. ``prefix``: empty for none."""

    page: Page
    fragment: bool
    prefix: str
    bibtex: bool


def settings(network: Network, layout: Layout, stem: str = "") -> Settings:
    """Return the form of a document: the layout, else [appendix] of the file, else the default.

    ``stem``: the name of the file without ending, of which a fragment's prefix is made. Raises
    NetworkError, in one line, for a value that does not exist and for a size of REVTeX.
    """
    section = network.appendix
    known = section.get("class", ARTICLE)
    given = layout.document_class if layout.document_class is not None else known
    kind = _one_of(given, CLASSES, _named("class", layout.document_class))
    columns = _one_of(_first(layout.columns, section.get("columns", 1)), COLUMNS,
                      _named("columns", layout.columns))
    page = _page(kind, columns, _size(layout, section.get("size"), kind, known), layout)
    flags = {}
    for key, value in (("fragment", layout.fragment), ("bibtex", layout.bibtex)):
        found = _first(value, section.get(key, False))
        if type(found) is not bool:
            raise NetworkError(f"[appendix] {key} is not true or false")
        flags[key] = found
    prefix = layout.prefix
    if prefix is not None and (not prefix or _clean(prefix) != prefix):
        raise NetworkError(f"the prefix {prefix!r} cannot begin a label; {_PREFIX}")
    if prefix is None:
        prefix = (_clean(stem).strip("-") or "appendix") if flags["fragment"] else ""
    return Settings(page, flags["fragment"], prefix, flags["fragment"] or flags["bibtex"])


def _first(asked: object, filed: object) -> object:
    return filed if asked is None else asked


def _named(key: str, asked: object) -> str:
    """Return how an error calls a value: one of the file with its section."""
    return f"[appendix] {key}" if asked is None else key


def _size(layout: Layout, filed: object, kind: str, filed_class: object) -> object:
    """Return the size; that of the file belongs to the class of the file."""
    size: object = layout.size
    if size is None and kind == filed_class:
        size = filed
    if size is not None and kind == REVTEX:
        raise NetworkError("REVTeX sets its own size; leave size out, or write class article")
    return 10 if size is None else size


def _page(kind: str, columns: int, size: object, layout: Layout) -> Page:
    points = _one_of(size, SIZES, _named("size", layout.size))
    line = LINES[kind, columns, points] if layout.width is None else layout.width
    return Page(kind, columns, points, line)


def _one_of(value: object, known: tuple[Value, ...], what: str) -> Value:
    for each in known:
        if type(value) is type(each) and value == each:
            return each
    listed = ", ".join(str(each) for each in known[:-1]) + f" or {known[-1]}"
    raise NetworkError(f"{what} is {value!r}; write {listed}")


def _clean(text: str) -> str:
    """Return a text with - for what may not stand in a prefix.

    >>> _clean("ring one.2")
    'ring-one-2'
    """
    return "".join(c if c.isascii() and (c.isalnum() or c in "-_") else "-" for c in text)


# -- LaTeX -----------------------------------------------------------------------------------------


def preamble(page: Page, packages: str, title: str) -> str:
    """Return what stands before the first section; ``title`` is LaTeX."""
    geometry = f"\\usepackage[textwidth={page.line:g}pt]{{geometry}}\n" if page.own_width else ""
    return (f"{_class(page)}\n{packages}{geometry}\\allowdisplaybreaks\n"
            f"\\begin{{document}}\n{_heading(page, title)}\n{SETTING}\n")


SETTING = r"""\setlength{\emergencystretch}{0.3\columnwidth}
\renewcommand{\arraystretch}{1.2}
"""
_SUBTITLE = "Stationary state, currents and responses in closed form"


def _class(page: Page) -> str:
    if page.document_class == REVTEX:
        return rf"\documentclass[aps,pre,{_REVTEX_COLUMNS[page.columns]}]{{revtex4-2}}"
    options = [f"{page.size}pt"] if page.size != 10 else []
    options += ["twocolumn"] if page.columns == 2 else []
    return rf"\documentclass{'[' + ','.join(options) + ']' if options else ''}{{article}}"


_REVTEX_COLUMNS = {1: "reprint,onecolumn", 2: "reprint,nobalancelastpage"}


def before_sources(page: Page) -> str:
    """Return what stands before the bibliography: REVTeX's rule across both columns would balance
    them, which formulas that cannot be cut make stick out."""
    return ("\\renewcommand{\\bibsection}{\\section*{References}}\n"
            if page.document_class == REVTEX else "")


def _heading(page: Page, title: str) -> str:
    if page.document_class == REVTEX:
        return f"\\title{{{title}\\\\ {_SUBTITLE}}}\n\\maketitle"
    heading = (f"\\begin{{center}}\n{{\\Large {title}\\par}}\n\\medskip\n{_SUBTITLE}\n"
               "\\end{center}")
    return heading if page.columns == 1 else f"\\twocolumn[{{%\n{heading}\n\\bigskip}}]"
