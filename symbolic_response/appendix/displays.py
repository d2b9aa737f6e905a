r"""Displayed formulas of the running text, broken where the line is too narrow for them.

Such an ``equation`` keeps its number. Formulas that ``\qquad`` or ``\quad`` set apart come on lines
of their own; one that is still too wide ends a line before a relation, then before a sign.
"""

from __future__ import annotations

import re
from collections.abc import Sequence

from symbolic_response.expressions.breaking import INDENT, NUMBER_ROOM
from symbolic_response.expressions.widths import formula_width

_EQUATION = re.compile(r"\\begin\{(equation\*?)\}\n(.*?)\\end\{equation\*?\}", re.DOTALL)
_LABEL = re.compile(r"\\label\{[^}]*\}")
_APART = re.compile(r"\s*\\q?quad\s+")
_RELATIONS, _SIGNS = ("=", r"\le"), ("+", "-")


def fitted(text: str, width: float) -> str:
    """Return a text whose displayed equations fit the width."""
    return _EQUATION.sub(lambda found: _fitted(found[0], found[1], found[2], width), text)


def _fitted(whole: str, kind: str, inside: str, width: float) -> str:
    label = "".join(_LABEL.findall(inside))
    formula = " ".join(_LABEL.sub("", inside).split())
    room = width - (0.0 if kind.endswith("*") else NUMBER_ROOM)
    if formula_width(formula) <= room:
        return whole
    body = " \\\\\n".join(_set(_lines(part, room - INDENT)) for part in _APART.split(formula))
    label = f"\n{label}" if label else ""
    return (f"\\begin{{{kind}}}\n\\begin{{gathered}}\n{body}\n\\end{{gathered}}{label}\n"
            f"\\end{{{kind}}}")


def _set(lines: Sequence[str]) -> str:
    """Return the lines of one formula, those after the first set in."""
    if len(lines) == 1:
        return lines[0]
    rows = [f"&{lines[0]}", *(rf"&\quad {line}" for line in lines[1:])]
    return "\\begin{aligned}\n" + " \\\\\n".join(rows) + "\n\\end{aligned}"


def _lines(formula: str, room: float) -> list[str]:
    r"""Return a formula in lines, each begun by a relation or a sign.

    >>> _lines("a = b + c", 20.0)
    ['a', '{}= b', '{}+ c']
    """
    if formula_width(formula) <= room:
        return [formula]
    for marks in (_RELATIONS, _SIGNS):
        parts = _parts(formula, marks)
        if len(parts) == 1:
            continue
        lines = [parts[0]]
        for part in parts[1:]:
            if formula_width(f"{lines[-1]} {part}") <= room:
                lines[-1] += f" {part}"
            else:
                lines.append(f"{{}}{part}")
        return [line for each in lines for line in _lines(each, room)]
    return [formula]


def _parts(formula: str, marks: tuple[str, ...]) -> list[str]:
    """Return a formula cut before each of some signs that stands in no braces, not at its start."""
    parts, depth = [""], 0
    for token in formula.split(" "):
        mark = token.removeprefix("{}")
        if mark in marks and depth == 0 and parts[-1].strip("{}"):
            parts.append(mark)
        else:
            parts[-1] = f"{parts[-1]} {token}".strip()
        depth += token.count("{") - token.count("}")
        depth -= token.count(r"\{") - token.count(r"\}")
    return parts
