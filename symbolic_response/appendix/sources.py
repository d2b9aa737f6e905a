r"""The sources a document cites, as data, printed and as BibTeX."""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Source:
    """An article. ``authors``: in LaTeX, given names as initials first; ``pages`` from the first
    one on, or the number of the article."""

    authors: tuple[str, ...]
    title: str
    journal: str
    volume: str
    pages: str
    year: int


# Titles, volumes and pages recalled, not checked against the papers.
SOURCES = {
    "kirchhoff": Source(
        ("G. Kirchhoff",),
        r"Ueber die Aufl{\"o}sung der Gleichungen, auf welche man bei der Untersuchung der "
        r"linearen Vertheilung galvanischer Str{\"o}me gef{\"u}hrt wird",
        "Ann. Phys. Chem.", "72", "497", 1847),
    "hill": Source(
        ("T. L. Hill",),
        "Studies in irreversible thermodynamics {IV}. Diagrammatic representation of steady state "
        "fluxes for unimolecular systems",
        "J. Theor. Biol.", "10", "442", 1966),
    "schnakenberg": Source(
        ("J. Schnakenberg",),
        "Network theory of microscopic and macroscopic behavior of master equation systems",
        "Rev. Mod. Phys.", "48", "571", 1976),
    "chaiken": Source(
        ("S. Chaiken",), "A combinatorial proof of the all minors matrix tree theorem",
        "SIAM J. Algebraic Discrete Methods", "3", "319", 1982),
    "owen": Source(
        ("J. A. Owen", "T. R. Gingrich", "J. M. Horowitz"),
        "Universal thermodynamic bounds on nonequilibrium response with biochemical applications",
        "Phys. Rev. X", "10", "011066", 2020),
    "martins": Source(
        ("G. {Fernandes Martins}", "J. M. Horowitz"),
        "Topologically constrained fluctuations and thermodynamics regulate nonequilibrium "
        "response", "Phys. Rev. E", "108", "044113", 2023),
    "support": Source(
        ("J. A. Owen", "J. M. Horowitz"), "Size limits the sensitivity of kinetic schemes",
        "Nat. Commun.", "14", "1280", 2023),
    "aslyamov": Source(
        ("T. Aslyamov", "M. Esposito"),
        "Nonequilibrium response for {Markov} jump processes: exact results and tight bounds",
        "Phys. Rev. Lett.", "132", "037101", 2024),
    "maes": Source(
        ("C. Maes", r"K. Neto{\v c}n{\'y}"), "Heat bounds and the blowtorch theorem",
        r"Ann. Henri Poincar{\'e}", "14", "1193", 2013),
    "liang": Source(
        ("S. Liang", "P. {De Los Rios}", "D. M. Busiello"),
        "Thermodynamic bounds on symmetry breaking in linear and catalytic biochemical systems",
        "Phys. Rev. Lett.", "132", "228402", 2024),
}


def cited_in(body: str) -> list[str]:
    """Return the keys of the sources a text cites, in the order of their first citation."""
    groups = re.findall(r"\\cite\{([^}]*)\}", body)
    return list(dict.fromkeys(key for group in groups for key in group.split(",")))


def bibliography(keys: Sequence[str]) -> str:
    """Return the sources as ``thebibliography``."""
    entries = [rf"\bibitem{{{key}}} {_printed(SOURCES[key])}" for key in keys]
    return "\\begin{thebibliography}{99}\n" + "\n".join(entries) + "\n\\end{thebibliography}"


def _printed(source: Source) -> str:
    *others, last = source.authors
    names = last if not others else (
        f"{', '.join(others)}{',' if len(others) > 1 else ''} and {last}")
    return (f"{names}, {source.title}, {source.journal} \\textbf{{{source.volume}}}, "
            f"{source.pages} ({source.year}).").replace(". ", r".\ ")


def bibtex(keys: Sequence[str], prefix: str) -> str:
    """Return the sources as a BibTeX file."""
    return "\n".join(_entry(f"{prefix}{key}", SOURCES[key]) for key in keys)


def _entry(key: str, source: Source) -> str:
    fields = {"author": " and ".join(source.authors), "title": f"{{{source.title}}}",
              "journal": source.journal, "volume": source.volume, "pages": source.pages,
              "year": f"{source.year}"}
    lines = ",\n".join(f"  {name} = {{{value}}}" for name, value in fields.items())
    return f"@article{{{key},\n{lines}\n}}\n"
