r"""Text of the file as LaTeX text: nothing in it is a command, and all of it is ASCII.

Accented letters become TeX accents, common signs their formula, and any other character that
pdfLaTeX's default fonts lack its code point, as [U+4E2D].
"""

from __future__ import annotations

import re
import unicodedata

_SPECIAL = {
    "\\": r"\textbackslash{}", "{": r"\{", "}": r"\}", "$": r"\$", "%": r"\%", "&": r"\&",
    "#": r"\#", "_": r"\_", "~": r"\textasciitilde{}", "^": r"\textasciicircum{}",
    "<": "$<$", ">": "$>$", "|": "$|$", '"': "''",
}
_ACCENTS = {
    "\u0300": "`", "\u0301": "'", "\u0302": "^", "\u0303": "~", "\u0304": "=", "\u0306": "u",
    "\u0307": ".", "\u0308": '"', "\u030a": "r", "\u030b": "H", "\u030c": "v", "\u0327": "c",
}
_LETTERS = {
    "ß": r"\ss{}", "æ": r"\ae{}", "Æ": r"\AE{}", "œ": r"\oe{}", "Œ": r"\OE{}", "ø": r"\o{}",
    "Ø": r"\O{}", "å": r"\aa{}", "Å": r"\AA{}", "ł": r"\l{}", "Ł": r"\L{}", "ı": r"\i{}",
    "–": "--", "—": "---", "‐": "-", "‑": "-", "‘": "`", "’": "'", "“": "``", "”": "''",
    "„": ",,", "…": r"\dots{}", "\u00a0": "~", "\u202f": r"\,", "\u2009": r"\,",
    "§": r"\S{}", "¶": r"\P{}", "©": r"\copyright{}", "£": r"\pounds{}", "†": r"\dag{}",
    "‡": r"\ddag{}", "•": r"\textbullet{}", "¡": "!`", "¿": "?`",
}
_FORMULAS = {
    "×": r"\times", "÷": r"\div", "±": r"\pm", "∓": r"\mp", "·": r"\cdot", "⋅": r"\cdot",
    "−": "-", "→": r"\to", "←": r"\leftarrow", "↔": r"\leftrightarrow", "⇌": r"\rightleftharpoons",
    "⇒": r"\Rightarrow", "⇄": r"\rightleftharpoons", "↑": r"\uparrow", "↓": r"\downarrow",
    "≤": r"\leq", "≥": r"\geq", "≠": r"\neq", "≈": r"\approx", "≡": r"\equiv", "∝": r"\propto",
    "∞": r"\infty", "∂": r"\partial", "∑": r"\sum", "∏": r"\prod", "∫": r"\int", "∇": r"\nabla",
    "∈": r"\in", "°": r"{}^{\circ}", "′": "'", "″": "''", "µ": r"\mu", "ℓ": r"\ell",
    "ħ": r"\hbar", "⟨": r"\langle", "⟩": r"\rangle", "√": r"\surd", "¬": r"\neg", "∼": r"\sim",
}
_GREEK = (
    "alpha beta gamma delta epsilon zeta eta theta iota kappa lambda mu nu xi omicron pi rho "
    "finalsigma sigma tau upsilon phi chi psi omega"
)
_CAPITALS = frozenset(("gamma", "delta", "theta", "lambda", "xi", "pi", "sigma", "upsilon",
                       "phi", "psi", "omega"))
_BOLTZMANN = re.compile(r"\bk\\_B\b( ?T\b)?")
_LONG_WORD, _BREAK_EVERY = 24, 8


def escaped(text: str) -> str:
    r"""Return a text as LaTeX that prints it, on one line, breaks allowed in very long words.

    >>> print(escaped("50% of k_on, \\input{x} für 1 µM"))
    50\% of k\_on, \textbackslash{}input\{x\} f\"{u}r 1 $\mu$M
    """
    words = re.split(r"\s+", text.strip())
    return _BOLTZMANN.sub(r"$k_{\\mathrm B}\1$", " ".join(_word(word) for word in words))


def typed(text: str) -> str:
    r"""Return a name or command in type of fixed width, breaks allowed behind its signs.

    >>> print(typed("my_net.json"))
    \texttt{my\_\allowbreak{}net.\allowbreak{}json}
    """
    pieces = re.findall(r"[^-_./\s]{1,12}[-_./]*|[-_./]+|\s+", text)
    shown = (" " if piece.isspace() else "".join(map(_single, piece)) for piece in pieces)
    return r"\texttt{" + r"\allowbreak{}".join(shown).replace(
        r"\allowbreak{} \allowbreak{}", " ") + "}"


def paragraphs(text: str) -> str:
    """Return a text of several paragraphs, blank lines between them kept."""
    return "\n\n".join(escaped(part) for part in re.split(r"\n\s*\n", text.strip()))


def _word(word: str) -> str:
    clusters = re.findall(r".[\u0300-\u036f]*", unicodedata.normalize("NFC", word))
    shown = [_cluster(cluster) for cluster in clusters]
    if sum(_size(text) for text in shown) <= _LONG_WORD:
        return "".join(shown)
    pieces, size = [""], 0
    for text in shown:
        if size >= _BREAK_EVERY:
            pieces.append("")
            size = 0
        pieces[-1] += text
        size += _size(text)
    return r"\allowbreak{}".join(pieces)


def _size(shown: str) -> int:
    """Return about how many characters wide a printed character is."""
    return len(shown) if shown.startswith("[U+") else 1


def _cluster(cluster: str) -> str:
    base, marks = cluster[0], cluster[1:]
    if marks:
        return "".join(_accented(base, marks)) if marks in _ACCENTS else _single(base)
    return _single(base)


def _single(character: str) -> str:
    if character in _SPECIAL:
        return _SPECIAL[character]
    if " " <= character <= "~":
        return character
    if character in _LETTERS:
        return _LETTERS[character]
    if character in _FORMULAS:
        return f"${_FORMULAS[character]}$"
    return _greek(character) or _decomposed(character)


def _greek(character: str) -> str:
    names = _GREEK.split()
    small, capital = ord(character) - 0x3B1, ord(character) - 0x391
    if 0 <= small < len(names):
        name = names[small]
        named = {"omicron": "o", "finalsigma": r"\varsigma"}.get(name, f"\\{name}")
        return f"${named}$"
    if 0 <= capital < len(names) and names[capital] in _CAPITALS:
        return f"$\\{names[capital].capitalize()}$"
    return ""


def _decomposed(character: str) -> str:
    """Return a letter with its accent, a raised or lowered character, or the code point."""
    parts = unicodedata.normalize("NFD", character)
    if len(parts) == 2 and parts[1] in _ACCENTS and parts[0].isascii():
        return _accented(parts[0], parts[1])
    kind, _, rest = unicodedata.decomposition(character).partition(" ")
    if kind in ("<super>", "<sub>") and " " not in rest:
        inner = chr(int(rest, 16))
        if inner.isascii() and inner.isalnum():
            return f"${{}}{'^' if kind == '<super>' else '_'}{{{inner}}}$"
    plain = unicodedata.normalize("NFKC", character)
    if plain != character and all(" " <= c <= "~" for c in plain):
        return "".join(_single(c) for c in plain)
    return f"[U+{ord(character):04X}]"


def _accented(base: str, mark: str) -> str:
    if not base.isascii() or not base.isalpha():
        return _single(base)
    dotless = {"i": r"\i", "j": r"\j"}.get(base, base) if _ACCENTS[mark] not in "c" else base
    return f"\\{_ACCENTS[mark]}{{{dotless}}}"
