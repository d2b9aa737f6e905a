r"""A document without a preamble, to ``\input`` into a paper; names that clash with no others."""

from __future__ import annotations

import re

from symbolic_response.appendix.page import SETTING, Settings

_NAMES = re.compile(r"\\(label|ref|eqref|cite|bibitem)\{([^}]*)\}")
_THEOREM = re.compile(r"\\(begin|end)\{theorem\}")
_LOWER = {r"\subsection": r"\subsubsection", r"\section": r"\subsection"}
_SECTIONS = re.compile(r"\\(?:sub)?section(?=[*{])")


def prefixed(body: str, prefix: str) -> str:
    r"""Return a text whose labels, references, citations and theorems carry a prefix.

    >>> print(prefixed(r"\label{eq:free} \eqref{eq:free} \cite{hill,owen}", "net"))
    \label{net:eq:free} \eqref{net:eq:free} \cite{net:hill,net:owen}
    """
    if not prefix:
        return body
    named = _NAMES.sub(lambda found: rf"\{found[1]}{{" + ",".join(
        f"{prefix}:{name}" for name in found[2].split(",")) + "}", body)
    return _THEOREM.sub(rf"\\\1{{{theorem_name(prefix)}}}", named)


def theorem_name(prefix: str) -> str:
    """Return the name of the environment of theorems."""
    return f"{prefix}-theorem" if prefix else "theorem"


def fragment(body: str, title: str, packages: str, chosen: Settings, bib: str) -> str:
    r"""Return the text of a fragment: a section, its own sections one level lower.

    ``packages``: the lines the paper's preamble needs; ``bib``: the name of the BibTeX file.
    """
    page = chosen.page
    needs = "".join(f"%   {line}\n" for line in packages.splitlines())
    cited = (f"% Sources: \\bibliography{{{bib}}}, beside others the paper cites.\n" if bib else "")
    lines = f"{page.line:g}pt, {page.size}pt type"
    declared = ""
    if r"\begin{theorem}" in body:
        declared = rf"\newtheorem{{{chosen.prefix}-theorem}}{{Theorem}}" + "\n"
    lower = _SECTIONS.sub(lambda found: _LOWER[found[0]], body)
    return (
        "% A fragment to \\input after \\appendix. The preamble needs\n" + needs + cited
        + f"% Formulas are broken for lines of {lines}.\n"
        f"% Labels and citations begin with {chosen.prefix}:\n"
        + declared + "\\begingroup\n\\allowdisplaybreaks\n" + SETTING
        + f"\\section{{{title}}}\n\\label{{{chosen.prefix}}}\n\n"
        + prefixed(lower, chosen.prefix) + "\n\\par\\endgroup\n"
    )
