r"""Rows of a display: which of them belong to one statement, labels and numbers taken off.

A row belongs to the statement above it if it begins with a relation, or with an operator where
nothing stands left of its ``&`` or no relation stands in it, or if that statement ends with one of
these. All rows of a multline are one. Each pair of columns is read by itself.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace

from symbolic_response.hand.latex.tokens import Token, formula_error, group_end, joined
from symbolic_response.hand.papers.statements import (
    OPERATORS,
    PUNCTUATION,
    RELATIONS,
    SPACING,
    TEXT,
    Statement,
    begins_with_condition,
    first_meaningful,
    last_meaningful,
    relation_at,
    split_statements,
    tops,
)

MAX_NESTING = 100
MAX_ENVIRONMENTS = 10
_INNER = frozenset(("split", "aligned", "alignedat", "gathered", "multlined"))
_COLUMNS = frozenset(("align", "flalign", "alignat", "xalignat", "xxalignat", "split", "aligned",
                      "alignedat"))
_COUNTED = frozenset(("alignat", "xalignat", "xxalignat", "alignedat"))
_DROPPED = frozenset((r"\nonumber", r"\notag", r"\displaystyle", r"\textstyle", r"\allowbreak",
                      r"\allowdisplaybreaks", r"\mathstrut", r"\qedhere", r"\qed", r"\square",
                      r"\blacksquare", r"\noindent", r"\nobreak", r"\break"))
_DROPPED_GROUPS = frozenset((r"\tag", r"\vspace", r"\mspace", r"\phantom", r"\hphantom",
                             r"\vphantom", r"\intertext", r"\shortintertext"))
_SPACES = frozenset((r"\hspace", r"\hfill", r"\hfil"))
_NUMBERS = frozenset((r"\eqno", r"\leqno"))


@dataclass(frozen=True, slots=True)
class _Row:
    """Tokens of one row, or of one pair of columns; ``left``: those before its ``&``."""

    tokens: tuple[Token, ...]
    left: tuple[Token, ...]
    aligned: bool
    label: str | None


def statements(tokens: Sequence[Token], environment: str, source: str) -> list[Statement]:
    """Return the statements of a display, from its expanded tokens, in their order.

    Raises FormulaError where braces do not match or nest more than 100 deep.
    """
    _check_braces(tokens, source)
    number = next((place for place, token in enumerate(tokens) if token.text in _NUMBERS), None)
    tokens = tokens[:number]
    found = [
        statement
        for row, label in _joined_rows(_unwrapped(list(tokens)), environment, source)
        for statement in split_statements(
            _without_null_delimiters(_flattened(_unboxed(row, source), source)), label, source)
    ]
    return sorted(found, key=lambda s: s.tokens[0].start if s.tokens else 0)


def _check_braces(tokens: Sequence[Token], source: str) -> None:
    opened: list[Token] = []
    environments = 0
    for token in tokens:
        environments += {r"\begin": 1, r"\end": -1}.get(token.text, 0)
        if token.text == "{":
            opened.append(token)
        elif token.text == "}":
            if not opened:
                raise formula_error(source, token.start, "'}' closes no brace; remove it")
            opened.pop()
        if len(opened) > MAX_NESTING or environments > MAX_ENVIRONMENTS:
            raise formula_error(source, token.start,
                                f"braces are nested more than {MAX_NESTING} deep, or environments "
                                f"more than {MAX_ENVIRONMENTS}")
        if environments < 0:
            raise formula_error(source, token.start, r"\end closes no environment; remove it")
    if opened:
        raise formula_error(source, opened[-1].start, "'{' is never closed; write the missing }")


# -- environments within a display, rows -----------------------------------------------------------


def _environment(tokens: Sequence[Token], place: int, source: str) -> tuple[str, int]:
    r"""Return the name after ``\begin`` or ``\end`` and the place behind it."""
    if place + 1 >= len(tokens) or tokens[place + 1].text != "{":
        raise formula_error(source, tokens[place].start,
                            f"write a name in braces after {tokens[place].text}")
    after = group_end(tokens, place + 1, source)
    return joined(tokens[place + 2 : after - 1]), after


def _unwrapped(tokens: list[Token]) -> list[Token]:
    r"""Return tokens with ``\left\{`` and ``\right.`` taken off a whole system of equations."""
    texts = [token.text for token in tokens]
    if texts[:3] == [r"\left", r"\{", r"\begin"] and texts[-2:] == [r"\right", "."]:
        return tokens[2:-2]
    return tokens


def _unboxed(tokens: list[Token], source: str) -> list[Token]:
    r"""Return tokens without a ``\boxed`` around all but punctuation."""
    if len(tokens) > 1 and tokens[0].text == r"\boxed" and tokens[1].text == "{":
        end = group_end(tokens, 1, source)
        if all(token.text in SPACING | PUNCTUATION for token in tokens[end:]):
            return tokens[2 : end - 1]
    return tokens


def _joined_rows(
    tokens: list[Token], environment: str, source: str
) -> Iterator[tuple[list[Token], str | None]]:
    """Yield the tokens and the label of what the rows of an environment say."""
    name = environment.rstrip("*")
    if name in _COUNTED and tokens and tokens[0].text == "{":
        tokens = tokens[group_end(tokens, 0, source):]
    streams: dict[int, list[tuple[list[Token], str | None]]] = {}
    for row in _rows(tokens, source):
        inner = _whole_environment(row.tokens, source)
        if inner is not None:
            for joined_tokens, label in _joined_rows(inner[1], inner[0], source):
                streams.setdefault(0, []).append((joined_tokens, label or row.label))
            continue
        for column, cell in _cells(row, name in _COLUMNS):
            stream = streams.setdefault(column, [])
            if stream and (name.startswith("multline") or _continues(cell, stream[-1][0], source)):
                stream[-1][0].extend(cell.tokens)
                stream[-1] = (stream[-1][0], stream[-1][1] or cell.label)
            else:
                stream.append((list(cell.tokens), cell.label))
    for stream in streams.values():
        yield from stream


def _whole_environment(
    tokens: Sequence[Token], source: str
) -> tuple[str, list[Token]] | None:
    """Return the name and inside of an environment of rows that makes up the tokens, or None."""
    if not tokens or tokens[0].text != r"\begin":
        return None
    name, start = _environment(tokens, 0, source)
    depth = 0
    for place, token in enumerate(tokens):
        depth += {r"\begin": 1, r"\end": -1}.get(token.text, 0)
        if depth == 0:
            _, after = _environment(tokens, place, source)
            rest = [t for t in tokens[after:] if t.text not in SPACING | PUNCTUATION]
            if name not in _INNER or rest:
                return None
            inside = list(tokens[start:place])
            return name, inside[_option(inside):]
    return None


def _option(tokens: Sequence[Token]) -> int:
    """Return how many tokens the option ``[t]`` before the rows of an environment takes."""
    return 3 if [token.text for token in tokens[:3:2]] == ["[", "]"] else 0


def _flattened(tokens: list[Token], source: str) -> list[Token]:
    """Return tokens with the rows of an environment on a right side run on.

    Only where each row after the first begins with a relation or an operator.
    """
    begins = [place for place, token in enumerate(tokens) if token.text == r"\begin"]
    ends = [place for place, token in enumerate(tokens) if token.text == r"\end"]
    if len(begins) != 1 or len(ends) != 1:
        return tokens
    name, start = _environment(tokens, begins[0], source)
    rows = list(_rows(tokens[start + _option(tokens[start:]) : ends[0]], source))
    tied = RELATIONS | OPERATORS
    if name not in _INNER or any(first_meaningful(row.tokens) not in tied for row in rows[1:]):
        return tokens
    _, after = _environment(tokens, ends[0], source)
    inside = [token for row in rows for token in row.tokens if token.text != "&"]
    return [*tokens[: begins[0]], *inside, *tokens[after:]]


def _rows(tokens: Sequence[Token], source: str) -> Iterator[_Row]:
    r"""Yield the rows of a text split at ``\\`` and at words between rows, empty ones left out."""
    row: list[Token] = []
    label: str | None = None
    depth, place = 0, 0
    while place <= len(tokens):
        token = tokens[place] if place < len(tokens) else None
        text = token.text if token is not None else r"\\"
        depth += {"{": 1, r"\begin": 1, "}": -1, r"\end": -1}.get(text, 0)
        place += 1
        if text in _DROPPED:
            continue
        if text in _SPACES and token is not None:
            row.append(replace(token, text=r"\quad"))
        if text in (r"\label", *_DROPPED_GROUPS, *_SPACES):
            start = place + (place < len(tokens) and tokens[place].text == "*")
            if start < len(tokens) and tokens[start].text == "{":
                place = group_end(tokens, start, source)
                if text == r"\label":
                    label = joined(tokens[start + 1 : place - 1])
            continue
        if token is not None and (depth or text != r"\\"):
            row.append(token)
            continue
        if any(t.text not in SPACING for t in row):
            yield _Row(tuple(row), (), False, label)
            label = None
        row = []
        place = _after_break(tokens, place)


def _after_break(tokens: Sequence[Token], place: int) -> int:
    r"""Return the place behind the star and the length of a ``\\``."""
    if place < len(tokens) and tokens[place].text == "*":
        place += 1
    if place < len(tokens) and tokens[place].text == "[" and not tokens[place].space:
        for end in range(place, min(place + 20, len(tokens))):
            if tokens[end].text == "]":
                return end + 1
    return place


def _cells(row: _Row, columns: bool) -> Iterator[tuple[int, _Row]]:
    """Yield the equations side by side in a row, with the number of their pair of columns."""
    cells: list[list[Token]] = [[]]
    depth = 0
    for token in row.tokens:
        depth += {"{": 1, r"\begin": 1, "}": -1, r"\end": -1}.get(token.text, 0)
        if token.text == "&" and depth == 0:
            cells.append([])
        else:
            cells[-1].append(token)
    step = 2 if columns else len(cells)
    found: dict[int, _Row] = {}
    for start in range(0, len(cells), step):
        pair = cells[start : start + step]
        inside = tuple(token for cell in pair for token in cell)
        first = first_meaningful(inside)
        if first in TEXT and found:  # words beside an equation are about it
            last = max(found)
            found[last] = replace(found[last], tokens=(*found[last].tokens, *inside))
        elif first:
            found[start] = _Row(inside, tuple(pair[0]), len(pair) > 1, row.label)
    for start, cell in found.items():
        yield start // step, cell


def _continues(row: _Row, above: Sequence[Token], source: str) -> bool:
    first, last = first_meaningful(row.tokens), last_meaningful(above, len(above))
    if first in RELATIONS or first == ":" or last in RELATIONS | OPERATORS:
        return True
    if first in TEXT:
        return begins_with_condition(row.tokens, source)
    bare = row.aligned and not first_meaningful(row.left)
    related = any(relation_at(row.tokens, place) for place in tops(row.tokens))
    if first in OPERATORS:
        return bare or not related
    return bare and not related


def _without_null_delimiters(tokens: list[Token]) -> list[Token]:
    r"""Return tokens without each ``\right.`` that a later ``\left.`` takes up again."""
    ends: list[int] = []
    dropped: set[int] = set()
    for place in range(len(tokens) - 1):
        if tokens[place + 1].text != ".":
            continue
        if tokens[place].text == r"\right":
            ends.append(place)
        elif tokens[place].text == r"\left" and ends:
            end = ends.pop()
            dropped |= {end, end + 1, place, place + 1}
    return [token for place, token in enumerate(tokens) if place not in dropped]
