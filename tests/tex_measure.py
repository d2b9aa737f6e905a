"""Measuring with TeX: widths of formulas, and the table of glyph widths made from them."""

from __future__ import annotations

import string
import subprocess
from collections.abc import Sequence
from pathlib import Path
from textwrap import wrap

STYLES = (r"\textstyle", r"\scriptstyle", r"\scriptscriptstyle")
_GREEK = (
    "alpha beta gamma delta epsilon zeta eta theta iota kappa lambda mu nu xi pi rho sigma tau "
    "upsilon phi chi psi omega varepsilon vartheta varpi varrho varsigma varphi Gamma Delta Theta "
    "Lambda Xi Pi Sigma Upsilon Phi Psi Omega"
)
_COMMANDS = (
    "cdot times pm mp to rightarrow leftarrow leftrightarrow rightleftharpoons infty partial "
    "langle rangle ell hbar circ ast star dagger ddagger prime nabla emptyset mid vert Vert neq "
    "leq geq le ge approx sim equiv propto oplus otimes bullet ldots cdots uparrow downarrow "
    "Re Im wp in setminus cup cap quad qquad"
)
GREEK, COMMANDS = _GREEK.split(), _COMMANDS.split()
HEAD = '''"""Widths of glyphs in pt, measured in TeX (article, 10 pt) by ``tests/tex_measure.py``.

A line of GLYPHS: a glyph, then for text, script and scriptscript size its width standing alone
and as a nucleus before a subscript. A line of KERNS: what TeX adds in these three sizes between
the glyphs of each pair that follows.
"""

'''
SINGLE = "+-=()[]/|,.;:!<>*"
CONTROL_SYMBOLS = (r"\{", r"\}", r"\_", r"\%", r"\#", r"\&", r"\,", r"\:", r"\;", r"\!", r"\|")


def measured(formulas: Sequence[str], folder: Path, preamble: str = "") -> list[float]:
    """Return the widths in pt of formulas set in article at 10 pt."""
    boxes = "\n".join(
        rf"\setbox0\hbox{{${formula}$}}\immediate\write\widths{{\the\wd0}}" for formula in formulas
    )
    (folder / "measure.tex").write_text(
        "\\documentclass{article}\\usepackage{amsmath}" + preamble
        + "\\newwrite\\widths\\immediate\\openout\\widths=measure.out\n\\begin{document}\n"
        + boxes + "\n\\end{document}\n"
    )
    subprocess.run(
        ["pdflatex", "-interaction=batchmode", "-halt-on-error", "measure.tex"],
        cwd=folder, check=True, capture_output=True, timeout=300,
    )
    lines = (folder / "measure.out").read_text().split()
    return [float(line.removesuffix("pt")) for line in lines]


def glyph_sources() -> dict[str, str]:
    """Return the LaTeX of each entry of the table, by its key there."""
    found = {letter: letter for letter in string.ascii_letters + string.digits}
    found |= {f"rm:{letter}": rf"\mathrm{{{letter}}}" for letter in string.ascii_letters}
    found["rm:-"] = r"\text{-}"
    found |= {
        f"bf:{letter}": rf"\mathbf{{{letter}}}" for letter in string.ascii_letters + string.digits
    }
    found |= {f"cal:{letter}": rf"\mathcal{{{letter}}}" for letter in string.ascii_uppercase}
    found |= {f"\\{name}": f"\\{name}" for name in (*GREEK, *COMMANDS)}
    found |= {symbol: symbol for symbol in (*SINGLE, *CONTROL_SYMBOLS)}
    return found


def kern_sources() -> dict[str, tuple[str, str, str]]:
    """Return both glyphs and the LaTeX of each pair that may be kerned, by its key."""
    letters = string.ascii_letters
    left = [*letters, *(f"\\{name}" for name in GREEK)]
    found = {
        f"rm:{a}{b}": (f"rm:{a}", f"rm:{b}", rf"\mathrm{{{a}{b}}}")
        for a in letters for b in letters
    }
    found |= {f"{a},{b}": (a, b, f"{a} {b}") for a in letters for b in letters}
    found |= {f"{a},{b}": (a, b, f"{a} {b}") for a in left for b in "/,."}
    return found


def glyph_table(folder: Path) -> str:
    """Return the module ``expressions/glyph_table.py``: widths and kerns, measured."""
    glyphs, pairs = glyph_sources(), kern_sources()
    widths: dict[str, list[float]] = {key: [] for key in glyphs}
    kerns: dict[str, list[float]] = {key: [] for key in pairs}
    for style in STYLES:
        whole = measured([f"{style} {source}" for source in glyphs.values()], folder)
        before = measured([f"{style} {source}_{{}}" for source in glyphs.values()], folder)
        for key, width, nucleus in zip(glyphs, whole, before, strict=True):
            widths[key] += [width, nucleus - 0.5]
        joined = measured([f"{style} {source}" for *_, source in pairs.values()], folder)
        for (key, (first, second, _)), width in zip(pairs.items(), joined, strict=True):
            alone = widths[first][-1 if key.startswith("rm:") else -2]
            kerns[key].append(width - alone - widths[second][-2])
    return table_text(widths, kerns)


def table_text(widths: dict[str, list[float]], kerns: dict[str, list[float]]) -> str:
    """Return the text of the module."""
    rows = [f"{key} " + " ".join(f"{value:.4f}" for value in row) for key, row in widths.items()]
    groups: dict[str, list[str]] = {}
    for key, row in kerns.items():
        if any(abs(value) > 0.002 for value in row):
            groups.setdefault(" ".join(f"{value:.3f}" for value in row), []).append(key)
    kern_rows = []
    for values, keys in groups.items():
        pieces = wrap(" ".join(keys), 90 - len(values))
        kern_rows += [f"{values} {piece}" for piece in pieces]
    return (
        HEAD + 'GLYPHS = r"""\n' + "\n".join(rows)
        + '\n"""\n\nKERNS = r"""\n' + "\n".join(kern_rows) + '\n"""\n'
    )
