"""Reading files and values strictly: sizes and shapes are checked before anything is believed."""

from __future__ import annotations

import json
import os
import re
import stat
from collections.abc import Container
from dataclasses import dataclass
from fractions import Fraction
from itertools import pairwise
from math import gcd, inf

MAX_BYTES = 64 * 2**20
MAX_ITEMS = 4_000_000  # commas and opening brackets of a file
MAX_NESTING = 40
MAX_DIGITS = 20_000
MAX_NUMBERS = 1_000  # in a list of rates
MAX_WORK = 2_000_000_000  # about microseconds

_NAME = re.compile(r"[A-Za-z][A-Za-z0-9_]*")
_FRACTION = re.compile(r"(-?[0-9]+)(?:/([0-9]+))?")
_JSON = re.compile(r'"[^"\\]*+(?:\\(?:.|\Z)[^"\\]*+)*+(?:"|\Z)|[\[\]{},]', re.DOTALL)
_CHUNK = 4_000  # digits that int() reads whatever the limit of the interpreter


@dataclass(frozen=True, slots=True)
class Verdict:
    """``status`` is valid, invalid, malformed, unreadable or incomplete.

    Of valid, ``got`` says how much was checked and ``statement`` what.
    """

    status: str
    entry: str = ""
    expected: str = ""
    got: str = ""
    statement: str = ""

    def __str__(self) -> str:
        if self.status == "valid":
            return f"valid ({self.got}): {cut(self.statement, 500)}"
        status = "incomplete: size limit" if self.status == "incomplete" else self.status
        return f"{status}: {self.entry}: expected {self.expected}, got {self.got}"

    def data(self) -> dict[str, str | None]:
        """Return the verdict for JSON, null for what there is not."""
        return {"status": self.status, "entry": self.entry or None,
                "expected": self.expected or None, "got": self.got or None,
                "statement": self.statement or None}


def exit_status(verdicts: list[Verdict]) -> int:
    """Return 0 if all are valid, else the first of 1 invalid, 2 malformed, unreadable, 3 others."""
    found = {verdict.status for verdict in verdicts}
    order = {"invalid": 1, "malformed": 2, "unreadable": 2, "incomplete": 3}
    return next((status for word, status in order.items() if word in found), 0)


class Rejected(Exception):
    """The check stops with this verdict."""

    def __init__(self, status: str, entry: str, expected: str, got: object) -> None:
        super().__init__(status, entry)
        self.verdict = Verdict(status, entry, expected, shown(got))


def malformed(entry: str, expected: str, got: object) -> Rejected:
    return Rejected("malformed", entry, expected, got)


def unreadable(expected: str, got: str) -> Rejected:
    return Rejected("unreadable", "file", expected, got)


def invalid(entry: str, expected: str, got: object) -> Rejected:
    return Rejected("invalid", entry, expected, got)


def too_large(entry: str, most: int, got: object) -> Rejected:
    return Rejected("incomplete", entry, f"at most {most}", got)


class Work:
    """An upper estimate of the work done, the same on every machine."""

    def __init__(self, most: int) -> None:
        self.left = most

    def charge(self, operations: int, bits: int) -> None:
        """Count operations on numbers of so many bits (division is quadratic in them)."""
        self.left -= operations * (1 + (bits >> 10) ** 2)
        if self.left < 0:
            raise Rejected("incomplete", "work", "a check within bounds", "more than is spent")


def cut(text: str, most: int) -> str:
    """Return a text, or the beginning of one that is too long."""
    return text if len(text) <= most else f"{text[:most * 2 // 3]}... ({len(text)} characters)"


def shown(value: object) -> str:
    """Return a short text of one line for any value of a record."""
    if isinstance(value, Fraction | int) and not isinstance(value, bool):
        bits = max(abs(value.numerator), value.denominator).bit_length()
        return str(value) if bits < 1000 else f"a number of about {bits * 3 // 10} digits"
    if isinstance(value, str):
        return cut(ascii(value)[1:-1], 300)
    if value is None or isinstance(value, bool):
        return "null" if value is None else str(value).lower()
    return f"a list of {len(value)}" if isinstance(value, list) else "an object"


def read_file(path: str | os.PathLike[str]) -> object:
    """Return the JSON value in a file, without repeated keys, floats or deep nesting."""
    try:
        descriptor = os.open(path, os.O_RDONLY | getattr(os, "O_NONBLOCK", 0))
        with open(descriptor, "rb") as file:
            if not stat.S_ISREG(os.fstat(descriptor).st_mode):
                raise unreadable("a regular file", "something else")
            data = file.read(MAX_BYTES + 1)
    except (OSError, ValueError) as error:
        reason = getattr(error, "strerror", None) or str(error)
        raise unreadable("a readable file", reason) from None
    if len(data) > MAX_BYTES:
        raise too_large("file", MAX_BYTES, "more bytes")
    try:
        text = data.decode("utf-8")
    except UnicodeDecodeError as error:
        raise malformed("file", "UTF-8", f"a wrong byte at {error.start}") from None
    del data
    _check_sizes(text)
    try:
        return json.loads(text, object_pairs_hook=_object, parse_float=_no_float,
                          parse_constant=_no_float, parse_int=_integer)
    except json.JSONDecodeError as error:
        place = f"line {error.lineno}, column {error.colno}"
        raise malformed("file", "JSON", f"{error.msg} at {place}") from None


def _check_sizes(text: str) -> None:
    depth = items = 0
    for found in _JSON.finditer(text):
        mark = text[found.start()]
        if mark in "[{,":
            items += 1
            depth += mark != ","
        elif mark in "]}":
            depth -= 1
        if depth < 0:
            raise malformed("file", "JSON", "a closing bracket without an opening one")
        if depth > MAX_NESTING:
            raise too_large("file", MAX_NESTING, "deeper nesting")
        if items > MAX_ITEMS:
            raise too_large("file", MAX_ITEMS, "more entries")


def _object(pairs: list[tuple[str, object]]) -> dict[str, object]:
    made = dict(pairs)
    if len(made) < len(pairs):
        keys = [key for key, _ in pairs]
        twice = next(key for at, key in enumerate(keys) if key in keys[:at])
        raise malformed("file", "each key once in an object", f"{twice} twice")
    return made


def _no_float(text: str) -> object:
    raise malformed("file", "integers and texts only", text)


def _integer(text: str) -> int:
    return integer(text, "file")


def integer(text: str, entry: str) -> int:
    """Read decimal digits, any number of them up to the limit."""
    if len(text) > MAX_DIGITS:
        raise too_large(entry, MAX_DIGITS, f"{len(text)} digits")
    value, digits = 0, text.removeprefix("-")
    for start in range(0, len(digits), _CHUNK):
        part = digits[start : start + _CHUNK]
        value = value * 10 ** len(part) + int(part)
    return -value if text.startswith("-") else value


def members(value: object, entry: str, *keys: str) -> list[object]:
    """Return the values of an object that has these keys and no others."""
    if type(value) is not dict:
        raise malformed(entry or "file", "an object", value)
    for key in keys:
        if key not in value:
            raise malformed(f"{entry}.{key}".lstrip("."), "a value", "no such key")
    for key in value:
        if key not in keys:
            raise malformed(entry or "file", "only known keys", key)
    return [value[key] for key in keys]


def items(value: object, entry: str, most: int, least: int = 1) -> list[object]:
    """Return a list of ``least`` to ``most`` members."""
    if type(value) is not list or len(value) < least or len(value) > most == least:
        raise malformed(entry, f"a list of {least}" + " or more" * (most > least), value)
    if len(value) > most:
        raise too_large(entry, most, len(value))
    return value


def text(value: object, entry: str) -> str:
    """Return a text that can be encoded."""
    if type(value) is not str or any("\ud800" <= letter <= "\udfff" for letter in value):
        raise malformed(entry, "a text", value)
    return value


def choice(value: object, entry: str, *known: str) -> str:
    """Return a text that is one of those known."""
    if type(value) is not str or value not in known:
        raise malformed(entry, " or ".join(known) if len(known) < 15 else "a known name", value)
    return value


def name(value: object, entry: str, taken: Container[str]) -> str:
    """Return a name that is not in ``taken`` yet."""
    if type(value) is not str or not _NAME.fullmatch(value):
        raise malformed(entry, "a name", value)
    if value in taken:
        raise malformed(entry, "a name that is free", value)
    return value


def place(value: object, entry: str, known: list[str]) -> int:
    """Return the place of a name in a list of names."""
    return known.index(choice(value, entry, *known))


def places(value: object, entry: str, known: list[str], least: int,
           most: int = MAX_NUMBERS) -> tuple[int, ...]:
    """Return the places of names that come in the order of a list of names."""
    found = tuple(place(one, f"{entry}[{k}]", known)
                  for k, one in enumerate(items(value, entry, most, least)))
    if any(a >= b for a, b in pairwise(found)):
        raise malformed(entry, "each once, in the order of the network", value)
    return found


def whole(value: object, entry: str, below: float = inf, least: int = 0) -> int:
    """Return an integer from ``least`` that is below a limit."""
    if type(value) is not int or not least <= value < below:
        raise malformed(entry, f"an integer from {least}" + f" below {below}" * (below < inf),
                        value)
    return value


def numbers(value: object, entry: str, below: int, least: int = 1) -> tuple[int, ...]:
    """Return a list of integers from 0 that are below a limit."""
    return tuple(whole(one, f"{entry}[{k}]", below)
                 for k, one in enumerate(items(value, entry, MAX_NUMBERS, least)))


def fraction(value: object, entry: str) -> Fraction:
    """Return the fraction that a text gives in lowest terms."""
    found = _FRACTION.fullmatch(value) if type(value) is str else None
    if found is None:
        raise malformed(entry, "a fraction such as \"12/35\"", value)
    above, below = integer(found[1], entry), integer(found[2] or "1", entry)
    leading = re.match(r"-0|-?0[0-9]", found[1]) or re.match(r"0|1\Z", found[2] or "2")
    if leading or gcd(above, below) != 1:
        raise malformed(entry, "a fraction in lowest terms", value)
    return Fraction(above, below)


def compare(value: object, wanted: object, entry: str) -> None:
    """Refuse what is not the value found: an object, a list, null or a number of such."""
    stated = value
    if isinstance(wanted, dict):
        for one, (key, inner) in zip(members(value, entry, *wanted), wanted.items(), strict=True):
            compare(one, inner, f"{entry}.{key}")
        return
    if isinstance(wanted, list):
        stated = items(value, entry, MAX_NUMBERS)
        for k, (one, inner) in enumerate(zip(stated, wanted, strict=False)):
            compare(one, inner, f"{entry}[{k}]")
        stated, wanted = len(stated), len(wanted)
    elif isinstance(wanted, int):
        stated = whole(value, entry)
    elif value is not None or not entry.endswith(".g"):  # which alone may be null
        stated = fraction(value, entry)
    if stated != wanted:
        raise invalid(entry, shown(wanted), stated)
