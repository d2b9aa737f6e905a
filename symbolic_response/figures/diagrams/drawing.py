"""Drawings of a network, as text for LaTeX, as SVG, and as files."""

from __future__ import annotations

import os
import shutil
import subprocess
import tempfile
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from pathlib import Path

from symbolic_response.errors import InputError, OutputError
from symbolic_response.expressions.names import nearest
from symbolic_response.figures.diagrams import grids
from symbolic_response.figures.diagrams.grids import Shown
from symbolic_response.figures.diagrams.layout import positions
from symbolic_response.figures.diagrams.network import network_picture
from symbolic_response.figures.diagrams.pictures import Picture
from symbolic_response.figures.diagrams.small import alike, small
from symbolic_response.figures.diagrams.svg import svg_grid
from symbolic_response.figures.diagrams.tikz import COLUMN_SPACE, document, tikz_grid
from symbolic_response.files import check_output, write_files
from symbolic_response.network.model import Network
from symbolic_response.response.analysis import Analysis, as_analysis
from symbolic_response.response.notation import Notation, notation_of

TEXT_WIDTH = 345.0
"""The width of the text of article at 10 pt, in pt."""
LIMIT = 32
"""How many trees, cycles, splittings or forests are drawn at the most."""
SUFFIXES = (".tex", ".pdf", ".svg")
SECONDS = 120


@dataclass(frozen=True, slots=True)
class Drawing:
    """One drawing: pictures in rows, and what a caption needs.

    ``shown`` of the ``total`` cycles, trees, splittings or forests are drawn; of more than the
    limit one is, as an example. ``rates`` says what stands at the rates of the network's picture:
    ``expressions`` (letters where these are long), ``letters`` or ``none``; ``letters`` are the
    transitions, by place, that show letters.
    """

    what: str
    title: str
    rows: tuple[tuple[Picture, ...], ...]
    shown: int
    total: int
    rates: str = ""
    letters: tuple[int, ...] = ()

    @property
    def width(self) -> float:
        """The width in pt."""
        across = len(self.rows[0])
        return across * (self.rows[0][0].box.width + COLUMN_SPACE) - COLUMN_SPACE

    @property
    def text(self) -> str:
        """The drawing in LaTeX, to be put into a figure; the preamble needs ``PREAMBLE``."""
        return tikz_grid(self.rows)

    @property
    def document(self) -> str:
        """A whole LaTeX document whose one page is just as large as the drawing."""
        return document(self.text)

    @property
    def svg(self) -> str:
        """The drawing as an SVG file."""
        return svg_grid(self.rows, self.title)

    def _repr_svg_(self) -> str:
        return self.svg


def draw(
    subject: Network | Analysis, what: str = "network", *, transition: str | int | None = None,
    root: str | int | None = None, width: float = TEXT_WIDTH, limit: int = LIMIT,
    letters: str | None = None, expressions: bool = True, cycle_letter: str = "C",
    notation: Notation | None = None,
) -> Drawing:
    r"""Draw a network, or its cycles, trees, splittings or forests.

    ``what``: ``network``; ``cycles``; ``trees`` towards ``root`` (the first state if not given);
    ``splittings`` of ``transition``; ``forests`` of the response of ``root`` to ``transition``,
    Phi_{k,e}, with their signs. ``transition`` is set off in all but cycles. ``width``: of the
    text, in pt, which rows are broken to. ``letters`` (``"generator"`` W_{ij}, ``"rate"``
    w^+_e, None for the shorter) stand at rates whose expressions are long, and at all of them
    unless ``expressions``. InputError for a wrong or missing argument; SizeLimitError where
    cycles or splittings are too many to be listed.

    >>> from symbolic_response.network import build_network
    >>> ring = build_network("ring", states="A B C", transitions=[
    ...     ("A", "B", "u", "v"), ("B", "C", "w", "x"), ("C", "A", "y", "z")])
    >>> made = draw(ring, "trees", root="B")
    >>> made.shown, made.total
    (3, 3)
    """
    if what not in grids.KINDS and what != "network":
        known = ("network", *grids.KINDS)
        raise InputError(f"there is no drawing {what!r}{nearest(what, known)};"
                         f" there are {', '.join(known)}")
    if letters not in (None, "generator", "rate"):
        raise InputError(f"there are no letters {letters!r}; write 'generator' or 'rate'")
    analysis = as_analysis(subject)
    network, graph = analysis.network, analysis.graph
    marked = _index(transition, network.transition_index, len(network.transitions), "transition")
    state = _index(root, network.state_index, len(network.states), "state")
    places = positions(graph)
    if what == "network":
        made = network_picture(network, graph, notation or notation_of(network), places,
                               width=width, letters=letters, expressions=expressions,
                               transition=marked)
        return Drawing(what, network.title, ((made.picture,),), 1, 1, made.rates,
                       made.letters)
    base = small(graph, places, None if what == "cycles" else marked)
    shown = grids.KINDS[what](analysis, base, grids.Asked(state, marked, limit, cycle_letter))
    return Drawing(what, network.title, _rows(shown, width), len(shown.pictures), shown.total)


def _index(
    given: str | int | None, find: Callable[[str], int], size: int, kind: str
) -> int | None:
    if given is None:
        return None
    if isinstance(given, str):
        return find(given)
    if not 0 <= given < size:
        raise InputError(f"there is no {kind} at place {given}; places run from 0 to {size - 1}")
    return given


def _rows(shown: Shown, width: float) -> tuple[tuple[Picture, ...], ...]:
    """Return pictures in rows of nearly the same length, none wider than the text."""
    pictures: Sequence[Picture] = alike(shown.pictures)
    most = max(1, int((width + COLUMN_SPACE) // (pictures[0].box.width + COLUMN_SPACE)))
    number = -(-len(pictures) // most)
    across = -(-len(pictures) // number)
    return tuple(
        tuple(pictures[start:start + across]) for start in range(0, len(pictures), across)
    )


def network_svg(network: Network | Analysis) -> str:
    """Return the picture of a network as an SVG file."""
    return draw(network).svg


def write_drawing(
    subject: Network | Analysis, path: str | os.PathLike[str], *, what: str = "network",
    transition: str | int | None = None, root: str | int | None = None,
    width: float = TEXT_WIDTH, limit: int = LIMIT, letters: str | None = None,
    expressions: bool = True,
) -> Drawing:
    """Write a drawing (see :func:`draw`) as ``.tex``, ``.pdf`` (by pdflatex) or ``.svg``.

    The file appears whole or not at all. OutputError where it cannot be written.
    """
    suffix = Path(path).suffix.lower()
    if suffix not in SUFFIXES:
        raise OutputError(f"{str(path)!r} has no suffix of a drawing; write .tex, .pdf or .svg")
    source = subject.network if isinstance(subject, Analysis) else subject
    check_output(path, source.path)
    made = draw(subject, what, transition=transition, root=root, width=width, limit=limit,
                letters=letters, expressions=expressions)
    content: str | bytes = made.svg if suffix == ".svg" else made.document
    if suffix == ".pdf":
        content = _compiled(made.document)
    write_files({Path(path): content})
    return made


def _compiled(text: str) -> bytes:
    """Return the PDF of a document; OutputError where pdflatex is missing or fails."""
    program = shutil.which("pdflatex")
    if program is None:
        raise OutputError("pdflatex is not installed; write .svg, or .tex to be compiled elsewhere")
    with tempfile.TemporaryDirectory() as folder:
        (Path(folder) / "drawing.tex").write_text(text, encoding="utf-8")
        command = [program, "-no-shell-escape", "-interaction=batchmode", "-halt-on-error",
                   "drawing.tex"]
        environment = dict(os.environ, SOURCE_DATE_EPOCH="0", FORCE_SOURCE_DATE="1")
        try:
            subprocess.run(command, cwd=folder, env=environment, stdin=subprocess.DEVNULL,
                           capture_output=True, check=True, timeout=SECONDS)
            return (Path(folder) / "drawing.pdf").read_bytes()
        except subprocess.TimeoutExpired:
            raise OutputError(f"pdflatex took more than {SECONDS} s; write .svg or .tex") from None
        except (OSError, subprocess.CalledProcessError):
            reason = _complaint(Path(folder) / "drawing.log")
            raise OutputError(f"pdflatex failed{reason}; write .svg or .tex") from None


def _complaint(log: Path) -> str:
    """Return the first error in pdflatex's log."""
    if not log.is_file():
        return ""
    for line in log.read_text(encoding="utf-8", errors="replace").splitlines():
        if line.startswith("!"):
            return f": {line[1:].strip()}"
    return ""
