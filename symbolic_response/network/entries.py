"""The parts that entries of a document are made of: names, texts, tables, values, LaTeX."""

from __future__ import annotations

import re
from collections.abc import Iterable, Mapping
from datetime import date, time
from fractions import Fraction
from numbers import Rational

from symbolic_response.errors import ExpressionError, NetworkError, SizeLimitError
from symbolic_response.expressions.names import NAME, nearest
from symbolic_response.expressions.reader import read_expression
from symbolic_response.expressions.tree import Expression, number
from symbolic_response.network.math_latex import refused

Place = tuple[str | int, ...]
Table = Mapping[str, object]


class DecimalText(str):
    """A decimal of a file, as the text it was written in."""

    __slots__ = ()


class DocumentError(NetworkError):
    """An entry breaks a rule; ``place`` is its path from the top: keys, and ordinals from 0."""

    def __init__(self, message: str, *place: str | int) -> None:
        super().__init__(message)
        self.place: Place = place


def shown(value: object) -> str:
    """Return a value as it may stand in a message: quoted, on one line, shortened."""
    if isinstance(value, bool):
        return str(value).lower()
    if isinstance(value, DecimalText):
        text = str(value)
    elif isinstance(value, str):
        text = quoted(value)
    elif isinstance(value, int | Fraction) and -(10**50) < value < 10**50:
        text = str(value)
    else:
        return kind_of(value)
    return text if len(text) <= 60 else f"{text[:40]}...{text[-10:]}"


def quoted(text: str) -> str:
    """Return a text in quotes, on one line, in characters that can be printed."""
    return repr(text).encode("utf-8", "backslashreplace").decode("utf-8")


def kind_of(value: object) -> str:
    """Return what sort of thing a value is, in the words of the file format."""
    match value:
        case bool():
            return str(value).lower()
        case DecimalText() | Rational():
            return "a number"
        case str():
            return "a text"
        case Mapping():
            return "a table"
        case list() | tuple():
            return "an array"
        case date() | time():
            return "a date or time"
        case float():
            return "a binary floating-point number"
    return f"a Python {type(value).__name__}"


def table_of(value: object, what: str, place: Place, hint: str = "write a table") -> Table:
    """Return ``value`` if it is a table; DocumentError otherwise."""
    if not isinstance(value, Mapping):
        raise DocumentError(f"{what} is {kind_of(value)}; {hint}", *place)
    return value


def check_keys(
    table: Table, known: Iterable[str], what: str, place: Place, noun: str = "key"
) -> None:
    """Refuse a key that is not known, with the nearest known one."""
    names = list(known)
    allowed = frozenset(names)
    for key in table:
        if key not in allowed:
            listed = ", ".join(names[:12]) + (", ..." if len(names) > 12 else "")
            hint = nearest(str(key), names) or f"; known: {listed}"
            raise DocumentError(f"{what} has no {noun} {shown(key)}{hint}", *place, key)


def check_name(name: object, kind: str, place: Place) -> str:
    """Return a name; DocumentError unless an ASCII letter, then letters, digits and ``_``."""
    if not isinstance(name, str) or isinstance(name, DecimalText) or not NAME.fullmatch(name):
        raise DocumentError(
            f"{kind} name {shown(name)}: write an ASCII letter, then letters, digits or _", *place
        )
    return name


def one_line(value: object, what: str, place: Place) -> str:
    """Return a text of one line that is not blank; DocumentError otherwise."""
    if type(value) is not str or not value.strip() or len(value.splitlines()) > 1:
        raise DocumentError(f"{what} is not a line of text; write some text in quotes", *place)
    return value


def read_latex(table: Table, what: str, place: Place) -> str | None:
    """Return the ``latex`` of an entry, None if it has none; DocumentError if unusable."""
    if "latex" not in table:
        return None
    place = (*place, "latex")
    latex = table["latex"]
    if isinstance(latex, str) and not latex.isprintable():
        raise DocumentError(f"{what}: latex {shown(latex)} holds a control character; write LaTeX "
                            "in single quotes", *place)
    latex = one_line(latex, f"{what}: latex", place)
    if not _balanced(latex) or re.search(r"(?<!\\)([$%&#]|[_^] *(}|$))", latex):
        raise DocumentError(
            f"{what}: latex {shown(latex)} cannot stand in a formula; balance its braces, "
            "end none of them with ^ or _, and write it without $, %, & and #", *place,
        )
    if (token := refused(latex)) is not None:
        token = token if len(token) <= 40 else f"{token[:40]}..."
        raise DocumentError(
            f"{what}: latex holds {token}, which is not allowed; use ASCII letters, signs and "
            "commands that only set mathematics, such as \\mathrm, \\hat and \\alpha", *place,
        )
    return latex


def _balanced(latex: str) -> bool:
    depth = 0
    for brace in re.findall(r"\\.|[{}]|\\$", latex):
        depth += {"{": 1, "}": -1, "\\": -1000}.get(brace, 0)
        if depth < 0:
            return False
    return depth == 0


def read_value(value: object, what: str, place: Place) -> Expression:
    """Return an expression given as a text, a number or already read; DocumentError otherwise."""
    if isinstance(value, Expression):
        return value
    if isinstance(value, DecimalText) and value.lstrip("+-") in ("inf", "nan"):
        raise DocumentError(f"{what} is {value}; write a finite number", *place)
    try:
        if isinstance(value, str):
            return read_expression(value)
        if isinstance(value, Rational) and not isinstance(value, bool):
            return number(Fraction(int(value.numerator), int(value.denominator)))
    except ExpressionError as error:
        raise DocumentError(f"{what}: {error}{_around(str(value), error.position)}",
                            *place) from None
    except SizeLimitError as error:
        raise DocumentError(f"{what}: {error}; write a shorter number", *place) from None
    raise DocumentError(
        f"{what} is {kind_of(value)}; write an exact number, or an expression in quotes", *place
    )


def _around(text: str, position: int | None) -> str:
    if position is None:
        return ""
    start, end = max(0, position - 20), position + 20
    piece = ("..." if start else "") + text[start:end] + ("..." if end < len(text) else "")
    return f", at character {position + 1} of {quoted(piece)}"
