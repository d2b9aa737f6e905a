"""The whole document, and writing it to a file."""

from __future__ import annotations

import os
import re
from collections.abc import Sequence
from pathlib import Path

from symbolic_response.appendix.bounded import bounded
from symbolic_response.appendix.bounds_section import bounds_section
from symbolic_response.appendix.certificates_section import certificates_section
from symbolic_response.appendix.control_section import control_section
from symbolic_response.appendix.cycles_section import cycles_section
from symbolic_response.appendix.escape import escaped
from symbolic_response.appendix.model_section import model_section
from symbolic_response.appendix.named_sums import NamedSums
from symbolic_response.appendix.paper import Paper
from symbolic_response.appendix.proofs_section import proofs_section
from symbolic_response.appendix.requests import extras, requested
from symbolic_response.appendix.results import results_section
from symbolic_response.appendix.trees_section import trees_section
from symbolic_response.expressions.tree import Expression
from symbolic_response.figures import pgfplots
from symbolic_response.files import check_output, write_files
from symbolic_response.network.model import Network
from symbolic_response.response.analysis import Analysis
from symbolic_response.response.quantity_latex import notation_of

TEXT_WIDTH = 345.0

# Volumes and pages recalled, not checked against the papers: kirchhoff, hill, chaiken, maes.
SOURCES = {
    "kirchhoff": r"G. Kirchhoff, Ann. Phys. Chem. \textbf{72}, 497 (1847).",
    "hill": r"T. L. Hill, J. Theor. Biol. \textbf{10}, 442 (1966).",
    "schnakenberg": r"J. Schnakenberg, Rev. Mod. Phys. \textbf{48}, 571 (1976).",
    "chaiken": r"S. Chaiken, SIAM J. Algebraic Discrete Methods \textbf{3}, 319 (1982).",
    "owen": r"J. A. Owen, T. R. Gingrich, and J. M. Horowitz, Phys. Rev. X \textbf{10}, 011066 "
            "(2020).",
    "martins": r"G. Fernandes Martins and J. M. Horowitz, Phys. Rev. E \textbf{108}, 044113 "
               "(2023).",
    "support": r"J. A. Owen and J. M. Horowitz, Nat. Commun. \textbf{14}, 1280 (2023).",
    "aslyamov": r"T. Aslyamov and M. Esposito, Phys. Rev. Lett. \textbf{132}, 037101 (2024).",
    "maes": r"C. Maes and K. Neto\v{c}n\'y, Ann. Henri Poincar\'e \textbf{14}, 1193 (2013).",
    "liang": r"S. Liang, P. De Los Rios, and D. M. Busiello, Phys. Rev. Lett. \textbf{132}, 228402 "
             "(2024).",
}


def appendix_text(
    network: Network,
    *,
    quantities: Sequence[str | Expression] | None = None,
    analysis: Analysis | None = None,
    width: float = TEXT_WIDTH,
    proofs_file: str | None = None,
) -> str:
    """Return a complete LaTeX document on a network.

    ``quantities`` (as text or read before) override those of the file; ``width`` is the width of
    the text in pt; ``proofs_file`` the name under which the text speaks of the record of proofs,
    None for not at all. Raises QuantityError or NetworkError for what cannot be used of these, and
    SizeLimitError past a limit of the analysis.
    """
    return _made(network, quantities, analysis, width, proofs_file)[0]


def write_appendix(
    network: Network,
    path: str | os.PathLike[str],
    *,
    quantities: Sequence[str | Expression] | None = None,
    analysis: Analysis | None = None,
) -> tuple[Path, ...]:
    """Write the document of :func:`appendix_text` and the record of its proofs; return the files.

    The record of ``out.tex`` is ``out.proofs.json``; there is none where nothing is proved. Both
    are written whole or not at all. Raises OutputError where that cannot be done.
    """
    target = Path(path)
    check_output(target, network.path)
    beside = target.with_name(target.stem + ".proofs.json")
    check_output(beside, network.path)
    text, record = _made(network, quantities, analysis, TEXT_WIDTH, beside.name)
    texts = {target: text} | ({} if record is None else {beside: record})
    write_files(texts)
    return tuple(texts)


def _made(
    network: Network,
    quantities: Sequence[str | Expression] | None,
    analysis: Analysis | None,
    width: float,
    proofs_file: str | None,
) -> tuple[str, str | None]:
    """Return the document and the record of its proofs, None where nothing is proved."""
    request, wanted = requested(network, quantities), extras(network)
    known = analysis if analysis is not None else Analysis(network)
    notation = notation_of(network)
    paper = Paper(network, known, notation, NamedSums(known, notation), width)
    sections = [
        model_section(paper, request.quantities),
        cycles_section(paper),
        trees_section(paper),
        results_section(paper, request.quantities, request.note),
    ]
    record = None
    entries = bounded(paper, request.quantities)
    if wanted.bounds:
        sections.append(bounds_section(paper, request.quantities))
    proved = ""
    if wanted.proofs:
        proofs = proofs_section(paper, entries, proofs_file, wanted.digests)
        proved, record = proofs.section, proofs.record
    sections += [control_section(paper, proved), proved]
    sections.append(certificates_section(paper, entries, wanted.certificates, wanted.digests))
    body = "\n\n".join(section for section in sections if section)
    text = _preamble(network, width, body) + body + "\n\n" + _bibliography(body)
    return text + "\n\\end{document}\n", record


def _preamble(network: Network, width: float, body: str) -> str:
    theorems = "\\usepackage{amsthm}\n\\newtheorem{theorem}{Theorem}\n"
    theorems = theorems if r"\begin{theorem}" in body else ""
    figures = pgfplots.PREAMBLE if r"\begin{tikzpicture}" in body else ""
    geometry = "" if width == TEXT_WIDTH else f"\\usepackage[textwidth={width:g}pt]{{geometry}}\n"
    return rf"""\documentclass{{article}}
\usepackage{{amsmath,amssymb}}
\usepackage{{array,booktabs,longtable}}
{figures}{theorems}{geometry}\allowdisplaybreaks
\setlength{{\emergencystretch}}{{0.3\textwidth}}
\renewcommand{{\arraystretch}}{{1.2}}
\begin{{document}}
\begin{{center}}
{{\Large {escaped(network.title)}\par}}
\medskip
Stationary state, currents and responses in closed form
\end{{center}}

"""


def _bibliography(body: str) -> str:
    """Return the list of exactly the sources cited, in the order of their first citation."""
    keys = [
        key for group in re.findall(r"\\cite\{([^}]*)\}", body) for key in group.split(",")
    ]
    entries = [rf"\bibitem{{{key}}} {SOURCES[key]}" for key in dict.fromkeys(keys)]
    return "\\begin{thebibliography}{9}\n" + "\n".join(entries) + "\n\\end{thebibliography}"
