"""The whole document, and writing it to a file."""

from __future__ import annotations

import os
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

from symbolic_response.appendix import displays
from symbolic_response.appendix.bounded import bounded
from symbolic_response.appendix.bounds_section import bounds_section
from symbolic_response.appendix.certificates_section import certificates_section
from symbolic_response.appendix.control_section import control_section
from symbolic_response.appendix.cycles_section import cycles_section
from symbolic_response.appendix.escape import escaped
from symbolic_response.appendix.figures_section import (
    FLUSHED,
    LOADED,
    STYLES,
    Diagrams,
    behind,
    diagrams,
)
from symbolic_response.appendix.fragment import fragment, prefixed, theorem_name
from symbolic_response.appendix.in_rates import named_sums_of
from symbolic_response.appendix.model_section import model_section
from symbolic_response.appendix.page import (
    DEFAULT,
    Layout,
    Settings,
    before_sources,
    preamble,
    settings,
)
from symbolic_response.appendix.paper import Paper
from symbolic_response.appendix.proofs_section import proofs_section
from symbolic_response.appendix.read_back import read_back, sentence
from symbolic_response.appendix.requests import extras, requested
from symbolic_response.appendix.results import results_section
from symbolic_response.appendix.sources import bibliography, bibtex, cited_in
from symbolic_response.appendix.trees_section import trees_section
from symbolic_response.errors import OutputError
from symbolic_response.expressions.tree import Expression
from symbolic_response.figures import pgfplots
from symbolic_response.files import check_output, write_files
from symbolic_response.network.model import Network
from symbolic_response.response.analysis import Analysis
from symbolic_response.response.notation import notation_of

_DIAGRAM = r"\begin{tikzpicture}[diagram]"


def appendix_text(
    network: Network,
    *,
    quantities: Sequence[str | Expression] | None = None,
    analysis: Analysis | None = None,
    layout: Layout = DEFAULT,
    proofs_file: str | None = None,
) -> str:
    """Return a complete LaTeX document on a network, or a fragment of one.

    ``quantities`` (as text or read before) override those of the file, ``layout`` its class,
    columns and size; ``proofs_file`` is the name under which the text speaks of the record of
    proofs, None for not at all. Raises QuantityError or NetworkError for what cannot be used of
    these, and SizeLimitError past a limit of the analysis.
    """
    chosen = settings(network, layout)
    return _made(network, quantities, analysis, chosen, proofs_file, "").text


def write_appendix(
    network: Network,
    path: str | os.PathLike[str],
    *,
    quantities: Sequence[str | Expression] | None = None,
    analysis: Analysis | None = None,
    layout: Layout = DEFAULT,
) -> tuple[Path, ...]:
    """Write the document of :func:`appendix_text` and what belongs to it; return the files.

    Beside ``out.tex`` these are ``out.proofs.json``, the record of its proofs, unless nothing is
    proved, and ``out.bib``, its sources, for a fragment and where it is asked for. All are written
    whole or not at all. Raises OutputError where that cannot be done.
    """
    target = Path(path)
    check_output(target, network.path)
    chosen = settings(network, layout, target.stem)
    proofs, bib = (target.with_name(target.stem + end) for end in (".proofs.json", ".bib"))
    for file in (target, proofs, *([bib] if chosen.bibtex else [])):
        check_output(file, network.path)
    if target in (proofs, bib):
        raise OutputError(f"{str(target)!r} is the name of a file written beside the document; "
                          "give it the ending .tex")
    made = _made(network, quantities, analysis, chosen, proofs.name, bib.stem)
    texts = {target: made.text}
    if made.record is not None:
        texts[proofs] = made.record
    if chosen.bibtex and made.sources:
        texts[bib] = made.sources
    write_files(texts)
    return tuple(texts)


@dataclass(frozen=True, slots=True)
class _Made:
    """A document, the record of its proofs (None where nothing is proved), its sources."""

    text: str
    record: str | None
    sources: str


def _made(
    network: Network,
    quantities: Sequence[str | Expression] | None,
    analysis: Analysis | None,
    chosen: Settings,
    proofs_file: str | None,
    bib: str,
) -> _Made:
    known = analysis if analysis is not None else Analysis(network)
    notation = notation_of(network)
    paper = Paper(network, known, notation, named_sums_of(known, notation), chosen.page)
    body, record = _body(paper, quantities, proofs_file)
    cited = cited_in(body)
    sources = bibtex(cited, f"{chosen.prefix}:" if chosen.prefix else "")
    title, packages = escaped(network.title), _packages(body)
    if chosen.fragment:
        body = STYLES + body if _DIAGRAM in body else body
        return _Made(fragment(body, title, packages, chosen, bib if cited else ""), record, sources)
    packages += STYLES if _DIAGRAM in body else ""
    listed = prefixed(bibliography(cited), chosen.prefix)
    before = (FLUSHED if r"\begin{figure" in body else "") + before_sources(chosen.page)
    listed = f"\n\n{before}{listed}" if cited else ""
    if r"\begin{theorem}" in body:
        packages += rf"\newtheorem{{{theorem_name(chosen.prefix)}}}{{Theorem}}" + "\n"
    whole = prefixed(body, chosen.prefix) + listed
    text = preamble(chosen.page, packages, title) + whole + "\n\\end{document}\n"
    return _Made(text, record, sources)


def _body(
    paper: Paper, quantities: Sequence[str | Expression] | None, proofs_file: str | None
) -> tuple[str, str | None]:
    """Return the sections, and the record of the proofs."""
    network = paper.network
    request, wanted = requested(network, quantities), extras(network)
    drawn = diagrams(paper, request.quantities) if wanted.diagrams else Diagrams()
    sections = [
        model_section(paper, request.quantities),
        drawn.network,
        cycles_section(paper),
        trees_section(paper),
        drawn.trees,
        behind(results_section(paper, request.quantities, request.note), drawn),
    ]
    record = None
    entries = bounded(paper, request.quantities)
    if wanted.bounds:
        sections.append(bounds_section(paper, request.quantities))
    sections.append(drawn.splittings)
    proved = ""
    if wanted.proofs:
        proofs = proofs_section(paper, entries, proofs_file, wanted.digests)
        proved, record = proofs.section, proofs.record
    sections += [control_section(paper, proved), proved]
    sections.append(certificates_section(paper, entries, wanted.certificates, wanted.digests))
    sections.append(sentence(read_back(paper)))
    body = "\n\n".join(section for section in sections if section)
    return displays.fitted(body, paper.width), record


def _packages(body: str) -> str:
    """Return the lines of a preamble that a text needs."""
    tables = "array,booktabs,longtable" if r"\begin{longtable}" in body else "array,booktabs"
    text = f"\\usepackage{{amsmath,amssymb}}\n\\usepackage{{{tables}}}\n"
    text += LOADED if _DIAGRAM in body else ""
    text += pgfplots.PREAMBLE if r"\begin{axis}" in body else ""
    return text + ("\\usepackage{amsthm}\n" if r"\begin{theorem}" in body else "")
