r"""Breaking a single formula that is wider than a line: plain parentheses, no tall delimiters.

What cannot be broken is rewritten first: a fraction becomes a product with the inverse of its
denominator, ``e^{...}`` and a root become ``\exp(...)`` and a power of parentheses. Then a line may
end before every sign, and between two factors, where the next line begins with a cross.
"""

from __future__ import annotations

import re
from collections.abc import Callable

_OPENING = re.compile(r"\\(?:d|t)?frac\{|\\sqrt\{|(?<![A-Za-z\\}])e\^\{")
_TALL = re.compile(r"\\(?:left|right|[bB]igg?[lr]?)(?=[()|\[\]])")
_SIGNS, _CROSSES = ("+", "-"), (r"\cdot", r"\times", r"\,")
_WORDS = re.compile(r"\\(?:ln|exp|log|tanh|cosh|sinh|max|min|le|ge|to|sum_.*|max_.*|min_.*)$")
_DERIVATIVE = re.compile(r"\\partial(?:\^\{?\d\}?)?(?: |(?=\\))")
_JOINED = re.compile(r"[)^_/,=<>|]|\\(?:le|ge|to|bigr|Bigr|right)\b")


def parts_of(body: str, limit: float, width: Callable[[str], float]) -> list[tuple[str, str]]:
    r"""Return the parts between which a line may end, each with its sign, none between factors that
    have none.

    ``width`` measures a formula; what is not wider than ``limit`` by itself is left together.

    >>> parts_of(r"\frac{a + b}{c}", 12.0, len)
    [('', '\\frac{1}{c}'), ('', '(a'), ('+', 'b)')]
    """
    return _split(_rewritten(_TALL.sub("", body), limit, width))


def _rewritten(body: str, limit: float, width: Callable[[str], float]) -> str:
    """Return a formula in which every wide fraction, root and exponential can be broken."""
    found = _OPENING.search(body)
    while found is not None:
        inside, end = _group(body, found.end() - 1)
        new = None
        if "frac" in found[0]:
            below, end = _group(body, end)
            whole = body[found.start():end]
            if width(whole) > limit:
                inverse = rf"\frac{{1}}{{{below}}}"
                if width(inverse) > limit:
                    inverse = f"({below})^{{-1}}"
                new = _product(inverse, inside, below)
        elif width(body[found.start():end]) > limit:
            new = rf"\exp({inside})" if found[0].startswith("e") else f"({inside})^{{1/2}}"
        if new is None:
            start = end
        else:
            if new.startswith(r"\exp") and body[end:].lstrip().startswith("("):
                new += r" \cdot"
            body, start = body[:found.start()] + new + body[end:], found.start()
        found = _OPENING.search(body, start)
    return body


def _product(inverse: str, above: str, below: str) -> str:
    """Return a fraction as a product; one of derivatives as an operator before what it acts on."""
    order = _DERIVATIVE.match(above)
    if order is not None:
        return rf"\frac{{{order[0].strip()}}}{{{below}}} ({above[order.end():]})"
    return inverse if above == "1" else f"{inverse} ({above})"


def _group(body: str, opening: int) -> tuple[str, int]:
    """Return what is inside the braces that open at a place, and where they have closed."""
    depth = 0
    for place in range(opening, len(body)):
        if body[place] in "{}" and body[place - 1] != "\\":
            depth += 1 if body[place] == "{" else -1
        if depth == 0:
            return body[opening + 1 : place], place + 1
    return body[opening + 1 :], len(body)


def _split(body: str) -> list[tuple[str, str]]:
    parts = [("", "")]
    for token in _tokens(body):
        sign, last = parts[-1]
        before = last.rsplit(" ", 1)[-1]
        if token in _SIGNS and last and not before.endswith("("):
            parts.append((token, ""))
        elif token in _CROSSES:
            parts += [("" if token == r"\," else token, "")] if last else []
        elif not last or _WORDS.search(before) or _JOINED.match(token) or before[-1] in "=(|/":
            parts[-1] = (sign, f"{last} {token}".strip())
        else:
            parts.append(("", token))
    return [part for part in parts if part[1]]


def _tokens(body: str) -> list[str]:
    """Return a formula cut at the spaces that are in no braces."""
    tokens, depth = [""], 0
    for place, character in enumerate(body):
        if character in "{}" and body[place - 1 : place] != "\\":
            depth += 1 if character == "{" else -1
        if character == " " and depth == 0 and not tokens[-1].endswith("\\"):
            tokens.append("")
            continue
        tokens[-1] += character
    return [token for token in tokens if token]
