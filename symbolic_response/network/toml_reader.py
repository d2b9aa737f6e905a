"""Reading the network file; each error says in one line where, what, and what to write instead."""

from __future__ import annotations

import os
import re
import tomllib

from symbolic_response.errors import NetworkError
from symbolic_response.network.checks import check_network
from symbolic_response.network.document import read_document
from symbolic_response.network.entries import DecimalText, DocumentError, quoted
from symbolic_response.network.lines import key_lines, line_of
from symbolic_response.network.model import Network

MAX_BYTES = 5_000_000
MAX_DIGITS = 1_000
MAX_PARTS = 100

_DIGITS = re.compile(rf"[0-9][0-9_]{{{MAX_DIGITS}}}", re.ASCII)
_DOTTED = re.compile(
    r"(?<![A-Za-z0-9_-])(?:(?:[A-Za-z0-9_-]++|\"[^\"\n]*+\"|'[^'\n]*+')[ \t]*+\.[ \t]*+)++"
)
_SYNTAX_HINTS = {
    "Cannot declare": "this table stands above already, so keep one of them",
    "Cannot overwrite": "this key stands above already, so keep one of them",
    "Duplicate": "keep one of them",
    "Invalid value": "put an expression in quotes",
    "Expected '=' after a key": "write KEY = VALUE",
    "Expected newline": "write one KEY = VALUE a line",
    "Invalid statement": "write KEY = VALUE or [TABLE]",
    "Unescaped '\\' in a string": "write LaTeX in single quotes",
    "Illegal character '\\n'": "close the quotes on the line they open on",
    "Found invalid character": "remove it",
    "Illegal character": "remove it",
    "Unterminated string": "close the quotes",
    "Expected \"'''\"": "close the quotes",
    "Expected '\"\"\"'": "close the quotes",
    "Expected ']": "close the name of the table as it was opened",
    "Invalid initial character": "begin a name with a letter",
    "Unclosed array": "put commas between the entries and ] at the end",
    "Unclosed inline table": "put commas between the entries and } at the end",
}


def read_network(path: str | os.PathLike[str]) -> Network:
    """Return the network that a TOML file of at most 5 MB describes.

    Raises NetworkError, its message one line that begins with file and line.
    """
    label = os.fsdecode(path)
    return read_network_text(_read_text(label), label)


def read_network_text(text: str, path: str | None = None) -> Network:
    """Return the network that a TOML text describes; ``path`` is for messages.

    Raises NetworkError, its message one line that begins with path and line.

    >>> read_network_text("tilte = 'ring'")  # doctest: +ELLIPSIS
    Traceback (most recent call last):
    ...
    symbolic_response.errors.NetworkError: <text>:1: ... no key 'tilte'; did you mean 'title'?
    """
    label = "<text>" if path is None else path
    text = text.removeprefix("\ufeff").replace("\r\n", "\n")
    document = _parse(text, label)
    try:
        network = read_document(document, path)
        check_network(network)
    except DocumentError as error:
        raise _fault(label, line_of(key_lines(text), error.place), str(error)) from None
    return network


def place_in_file(path: str | None, place: tuple[str | int, ...]) -> str:
    """Return where in its file an entry of a network stands, as ``FILE:LINE``, for messages.

    Without a file, or where it can no longer be read, the keys and ordinals of the entry.
    """
    if path is not None:
        try:
            text = _read_text(path).removeprefix("\ufeff").replace("\r\n", "\n")
        except NetworkError:
            return path
        return f"{path}:{line_of(key_lines(text), place)}"
    return " ".join(str(part + 1) if isinstance(part, int) else part for part in place)


def _read_text(label: str) -> str:
    try:
        with open(label, "rb") as file:
            data = file.read(MAX_BYTES + 1)
    except IsADirectoryError:
        raise _fault(label, None, "this is a folder; name the network file in it") from None
    except OSError as error:
        reason = (error.strerror or "it cannot be read").lower()
        raise _fault(label, None, f"{reason}; name a network file that can be read") from None
    except ValueError:
        raise _fault(label, None, "this cannot be a file name; name a network file") from None
    if len(data) > MAX_BYTES:
        raise _fault(label, None, _too_long())
    try:
        return data.decode("utf-8")
    except UnicodeDecodeError as error:
        line = data.count(b"\n", 0, error.start) + 1
        raise _fault(label, line, f"the byte 0x{data[error.start]:02x} is not UTF-8; "
                                  "save the file as UTF-8") from None


def _parse(text: str, label: str) -> dict[str, object]:
    """Return what TOML makes of a text, a decimal as its own text."""
    if len(text) > MAX_BYTES:
        raise _fault(label, None, _too_long())
    _check_lengths(text, label)
    try:
        return tomllib.loads(text, parse_float=lambda digits: DecimalText(digits.replace("_", "")))
    except RecursionError:
        raise _fault(label, None, "arrays or tables are nested too deeply; write them flat"
                     ) from None
    except ValueError as error:
        what = str(error)
        found = re.search(r" \(at line ([0-9]+), column ([0-9]+)\)$", what)
        line = int(found[1]) if found else text.count("\n") + (not text.endswith("\n"))
        what = re.sub(r" \(at [^()]*\)$", "", what)
        hint = next((hint for start, hint in _SYNTAX_HINTS.items() if what.startswith(start)),
                    "see the network file in the README")
        column = f" at column {found[2]}" if found else " at the end of the file"
        raise _fault(label, line, f"not valid TOML: {what}{column}; {hint}") from None


def _check_lengths(text: str, label: str) -> None:
    """Refuse what would take long to read before anything is known about it."""
    digits = _DIGITS.search(text)
    if digits:
        raise _fault(label, text.count("\n", 0, digits.start()) + 1,
                     f"a number of more than {MAX_DIGITS} digits; write a shorter one")
    for found in _DOTTED.finditer(text):
        if found.group().count(".") > MAX_PARTS:
            raise _fault(label, text.count("\n", 0, found.start()) + 1,
                         f"a key of more than {MAX_PARTS} parts; write a shorter one")


def _too_long() -> str:
    return f"longer than {MAX_BYTES} bytes; write a smaller network"


def _fault(label: str, line: int | None, message: str) -> NetworkError:
    shown = label if label.isprintable() else quoted(label)
    message = message if len(message) <= 500 else f"{message[:300]} ... {message[-150:]}"
    return NetworkError(f"{shown}: {message}" if line is None else f"{shown}:{line}: {message}")
