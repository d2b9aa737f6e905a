"""Labels of figures: LaTeX of the file where the plotting library can set it, else plain text."""

from __future__ import annotations

import re
import textwrap
from functools import cache

from matplotlib.font_manager import FontProperties, findfont, get_font
from matplotlib.mathtext import MathTextParser

from symbolic_response.figures.saving import STYLE

_PLAINER = {
    r"\Bigl": r"\left", r"\Bigr": r"\right", r"\bigl": r"\left", r"\bigr": r"\right",
    r"\big": "", r"\Big": "", r"\tfrac": r"\frac", r"\stackrel": r"\overset",
    r"\displaystyle": "", r"\textstyle": "", r"\scriptstyle": "", r"\scriptscriptstyle": "",
    r"\mathstrut": "", r"\lvert": "|", r"\rvert": "|", r"\lVert": r"\Vert", r"\rVert": r"\Vert",
    r"\le": r"\leq", r"\ge": r"\geq", r"\gets": r"\leftarrow",
    r"\textrm": r"\mathrm", r"\textup": r"\mathrm", r"\textnormal": r"\mathrm",
    r"\textit": r"\mathit", r"\textbf": r"\mathbf", r"\textsf": r"\mathsf", r"\texttt": r"\mathtt",
}
"""Other names of commands, and those that differ in size or spacing only."""
_NO_GLYPH = 0xA4
_PLACE = "\N{OBJECT REPLACEMENT CHARACTER}"
_FONTS = ("STIXGeneral", "DejaVu Sans")


def math_label(latex: str, plain: str) -> str:
    """Return a formula as a label, the plain text where it cannot be set."""
    shown = re.sub(r"\\[A-Za-z]+", lambda found: _PLAINER.get(found[0], found[0]), latex)
    return f"${shown}$" if can_be_set(shown) else text_label(plain)


def can_be_set(latex: str) -> bool:
    r"""Return whether a formula can be set, every glyph of it.

    >>> [can_be_set(latex) for latex in (r"\frac{k_{on}}{2}", r"\rightleftdragon", "中", "", "$")]
    [True, False, False, False, False]
    """
    if not latex.strip() or not latex.isascii() or re.search(r"(?<!\\)\$", latex):
        return False
    font = FontProperties(family="STIXGeneral", math_fontfamily=str(STYLE["mathtext.fontset"]))
    try:
        parsed = MathTextParser("path").parse(f"${latex}$", prop=font)
    except (ValueError, RuntimeError):
        return False
    return all(glyph[2] != _NO_GLYPH for glyph in parsed.glyphs)


def text_label(text: str) -> str:
    r"""Return a text that prints as it stands; a character without a glyph as its code point.

    >>> print(text_label("cost in $, 中 and µM"))
    cost in \$, [U+4E2D] and µM
    """
    shown = "".join(char if ord(char) in _glyphs() else f"[U+{ord(char):04X}]"
                    for char in re.sub(r"\s+", " ", text.strip()))
    return shown.replace("$", r"\$")


def with_about(label: str, about: str, width: int) -> str:
    """Return a label and what the file says about it, in lines of about ``width`` characters."""
    if not about.strip():
        return label
    letters = re.sub(r"\\(mathrm|[,;:! ])|[${}^_]", "", label)
    place = _PLACE * len(re.sub(r"\\[A-Za-z]+", "x", letters))
    lines = textwrap.wrap(f"{place} ({text_label(about)})", width, break_long_words=False)
    return "\n".join(lines).replace(place, label, 1)


@cache
def _glyphs() -> frozenset[int]:
    """Return the code points that the fonts of a figure have."""
    fonts = [get_font(findfont(FontProperties(family=name))) for name in _FONTS]
    return frozenset(code for font in fonts for code in font.get_charmap())
