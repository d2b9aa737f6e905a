r"""Statements: a joined row of a display cut at commas, words and relations.

A comma, a semicolon, a wide space or a word such as "and" between two formulas with a relation
each separates them. Other words beside a formula may change what it says, so it is not read.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace

from symbolic_response.hand.latex.tokens import Token, group_end, joined

SPACING = frozenset((r"\,", r"\;", r"\:", r"\!", r"\>", r"\ ", "~", r"\quad", r"\qquad", "&"))
_WIDE = frozenset((r"\quad", r"\qquad"))
_THIN = frozenset((r"\,", r"\;", r"\:", r"\>", r"\ ", "~"))
TEXT = frozenset((r"\text", r"\mbox", r"\textrm", r"\textnormal", r"\hbox", r"\textit"))
_EQUALS = frozenset(("=", r"\equiv", r"\coloneqq", r"\coloneq", r"\triangleq"))
_OTHER = frozenset((
    "<", ">", r"\approx", r"\simeq", r"\sim", r"\propto", r"\le", r"\leq", r"\leqslant", r"\ge",
    r"\geq", r"\geqslant", r"\ll", r"\gg", r"\lesssim", r"\gtrsim", r"\ne", r"\neq", r"\cong",
    r"\doteq", r"\asymp", r"\prec", r"\succ", r"\subset", r"\in", r"\notin", r"\to", r"\gets",
    r"\rightarrow", r"\leftarrow", r"\longrightarrow", r"\mapsto", r"\Rightarrow", r"\implies",
    r"\Longrightarrow", r"\iff", r"\Leftrightarrow", r"\Longleftrightarrow", r"\leftrightarrow",
    r"\eqqcolon",
))
RELATIONS = _EQUALS | _OTHER
OPERATORS = frozenset(("+", "-", "*", "/", r"\cdot", r"\times", r"\pm", r"\mp", r"\div"))
_OPENING = frozenset(("{", "(", "[", r"\{", r"\lbrace", r"\langle", r"\left", r"\begin"))
_CLOSING = frozenset(("}", ")", "]", r"\}", r"\rbrace", r"\rangle", r"\right", r"\end"))
_SCRIPTS = ("_", "^")
_NEAR = 12
PUNCTUATION = frozenset((".", ",", ";", ":"))
_CONNECTING = frozenset(("and", "where", "with", "so", "hence", "thus", "therefore", "i.e", "that",
                         "is", "also", "while", "then", "giving"))
_CONDITIONS = frozenset(("if", "for", "when", "as", "at", "otherwise", "unless", "or", "in", "by",
                         "because", "since", "provided", "near", "under"))


@dataclass(frozen=True, slots=True)
class Statement:
    """``parts[0] relations[0] parts[1] ...``; ``refusal``: why it is not read.

    ``tokens`` are all of it; relations that mean equality are ``=``.
    """

    tokens: tuple[Token, ...]
    parts: tuple[tuple[Token, ...], ...]
    relations: tuple[str, ...]
    label: str | None
    refusal: str | None = None


def depths(tokens: Sequence[Token]) -> list[int]:
    r"""Return for each token how many brackets it stands in; brackets count as inside."""
    found: list[int] = []
    depth, after = 0, ""
    for token in tokens:
        delimiter = after in (r"\left", r"\right")
        closes = token.text in _CLOSING and not delimiter
        found.append(max(depth, 1) if delimiter or token.text in _OPENING else depth)
        if closes:
            depth = max(0, depth - 1)
        elif token.text in _OPENING and not delimiter:
            depth += 1
        after = token.text
    return found


def meaningful(tokens: Sequence[Token]) -> Iterator[str]:
    """Yield the texts of tokens without spaces, empty groups and invisible delimiters.

    A script of one token comes with its mark, as in ``_-``: its sign is no operator.
    """
    texts = [token.text for token in tokens if token.text not in SPACING]
    place = 0
    while place < len(texts):
        if texts[place : place + 2] in (["{", "}"], [r"\left", "."], [r"\right", "."]):
            place += 2
        elif texts[place] in _SCRIPTS and texts[place + 1 : place + 2] not in ([], ["{"]):
            yield texts[place] + texts[place + 1]
            place += 2
        else:
            yield texts[place]
            place += 1


def first_meaningful(tokens: Sequence[Token]) -> str:
    """Return the first text of :func:`meaningful`, or ``""``."""
    return next(meaningful(tokens), "")


def last_meaningful(tokens: Sequence[Token], end: int) -> str:
    """Return the last text of :func:`meaningful` before a place, ``""`` if it is far away."""
    start = max(0, end - _NEAR)
    if start and tokens[start - 1].text in _SCRIPTS:
        start -= 1
    return next(iter([*meaningful(tokens[start:end])][-1:]), "")


def tops(tokens: Sequence[Token]) -> list[int]:
    """Return the places of tokens that stand in no bracket and are no script."""
    return [place for place, depth in enumerate(depths(tokens))
            if depth == 0 and not (place and tokens[place - 1].text in _SCRIPTS)]


def relation_at(tokens: Sequence[Token], place: int) -> str:
    """Return the relation that begins at a place: ``=`` for all that mean equality, or ``""``."""
    text = tokens[place].text
    if text == ":" and place + 1 < len(tokens) and tokens[place + 1].text == "=":
        return ":="
    return text if text in RELATIONS else ""


def split_statements(
    tokens: Sequence[Token], label: str | None, source: str
) -> Iterator[Statement]:
    """Yield the statements of a joined row."""
    pieces: list[list[Token]] = [[]]
    refusal: str | None = None
    places = set(tops(tokens))
    place = 0
    while place < len(tokens):
        token = tokens[place]
        words = _words(tokens, place, source) if place in places else None
        if words is not None:
            inside, place = words
            refusal = refusal or _refused(inside)
            pieces.append([])
            continue
        if place in places and (token.text in (",", ";") or _wide_break(tokens, place)):
            pieces.append([])
        else:
            pieces[-1].append(token)
        place += 1
    whole = [piece for piece in (_trimmed(piece) for piece in pieces) if piece]
    stated = [_related(piece, label) for piece in whole]
    for statement in stated[1:]:
        if not statement.relations and refusal is None:
            refusal = (f"{_shown(statement.tokens)} beside the formula is no equation; put it "
                       "outside of the display")
    if refusal is None:
        yield from stated
    elif whole:
        yield replace(_related(_trimmed(tokens), label), refusal=refusal)


def begins_with_condition(tokens: Sequence[Token], source: str) -> bool:
    """Whether a row begins with words that are about the row above."""
    place = next(place for place, token in enumerate(tokens) if token.text in TEXT)
    words = _words(tokens, place, source)
    return words is not None and _refused(words[0]) is not None


def _words(tokens: Sequence[Token], place: int, source: str) -> tuple[str, int] | None:
    r"""Return the words of a ``\text`` that is no name, and the place behind it."""
    upright = tokens[place].text in (r"\mathrm", r"\rm")
    if not (upright or tokens[place].text in TEXT) or place + 1 >= len(tokens):
        return None
    if tokens[place + 1].text != "{" or (place and tokens[place - 1].text in ("_", "^")):
        return None
    after = group_end(tokens, place + 1, source)
    inside = tokens[place + 2 : after - 1]
    shown = "".join((" " if t.space or t.text == "~" else "") + t.text for t in inside).strip()
    closing_space = bool(inside) and tokens[after - 1].space
    several = " " in shown or closing_space or any(t.space for t in inside)
    plain = [word.strip(".,;:()") for word in shown.lower().split()]
    known = bool(plain) and plain[0] in _CONNECTING | _CONDITIONS
    if known or (not upright and (several or not any(plain))):
        return shown, after
    return None


def _refused(words: str) -> str | None:
    plain = [word.strip(".,;:") for word in words.lower().split()]
    if all(word in _CONNECTING or not word for word in plain):
        return None
    shown = words if len(words) <= 40 else words[:40] + "..."
    return f'the words "{shown}" beside the formula are not read; put them outside of the display'


def _wide_break(tokens: Sequence[Token], place: int) -> bool:
    """Whether a wide space, or two narrow ones, stand between two formulas, not within one."""
    after_it = tokens[place + 1].text if place + 1 < len(tokens) else ""
    if tokens[place].text not in _WIDE and not (tokens[place].text in _THIN and after_it in _THIN):
        return False
    before = last_meaningful(tokens, place)
    after = first_meaningful(tokens[place : place + _NEAR])
    tied = RELATIONS | OPERATORS
    return bool(before) and before not in tied and after not in tied and after != ":"


def _trimmed(tokens: Sequence[Token]) -> list[Token]:
    """Return a piece without spaces and punctuation at its ends."""
    found = list(tokens)
    while found and found[-1].text in SPACING | PUNCTUATION:
        if found[-1].text == "." and len(found) > 1 and found[-2].text == r"\right":
            break
        found.pop()
    while found and found[0].text in SPACING:
        found.pop(0)
    return found


def _related(tokens: Sequence[Token], label: str | None) -> Statement:
    """Return a piece cut at its relations."""
    parts: list[list[Token]] = [[]]
    relations: list[str] = []
    top = set(tops(tokens))
    place = 0
    while place < len(tokens):
        relation = relation_at(tokens, place) if place in top else ""
        if relation:
            relations.append("=" if relation == ":=" or relation in _EQUALS else relation)
            parts.append([])
            place += 2 if relation == ":=" else 1
        else:
            parts[-1].append(tokens[place])
            place += 1
    trimmed = tuple(tuple(_trimmed(part)) for part in parts)
    return Statement(tuple(tokens), trimmed, tuple(relations), label)


def _shown(tokens: Sequence[Token]) -> str:
    text = joined(tokens)
    return text if len(text) <= 40 else text[:40] + "..."
