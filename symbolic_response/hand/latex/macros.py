r"""Macros of a text: ``\newcommand`` and its like, expanded on tokens, within bounds.

A token that comes from the body of a macro has the place of the macro call; one that comes from
an argument keeps its own.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

from symbolic_response.errors import FormulaError
from symbolic_response.hand.latex.tokens import Token, formula_error, group_end

MAX_EXPANSIONS = 20_000
MAX_TOKENS = 2_000_000
_COMMANDS = frozenset(
    f"\\{name}command{star}" for name in ("new", "renew", "provide") for star in ("", "*")
)
_OPERATORS = frozenset((r"\DeclareMathOperator",))
_DEFINE = frozenset((r"\def",))


@dataclass(frozen=True, slots=True)
class Macro:
    """A macro of ``parameters`` arguments, the first optional if ``default`` is not None."""

    parameters: int
    body: tuple[Token, ...]
    default: tuple[Token, ...] | None = None


def take_definitions(
    tokens: Sequence[Token], source: str
) -> tuple[list[Token], dict[str, Macro]]:
    r"""Return the tokens without the definitions of macros, and the macros by control word.

    ``\newcommand``, ``\renewcommand``, ``\providecommand``, ``\DeclareMathOperator`` and ``\def``
    with plain parameters. Raises FormulaError for a definition that is not well formed. A later
    definition replaces an earlier one, except by ``\providecommand``.

    >>> from symbolic_response.hand.latex.tokens import tokenize
    >>> text = r"\newcommand{\on}[1]{k_{#1}} \on{a}"
    >>> rest, macros = take_definitions(tokenize(text), text)
    >>> "".join(token.text for token in expand(rest, macros, text))
    'k_{a}'
    """
    rest: list[Token] = []
    macros: dict[str, Macro] = {}
    place = 0
    while place < len(tokens):
        token = tokens[place]
        if token.text in _COMMANDS or token.text in _OPERATORS or token.text in _DEFINE:
            read = _Definition(tokens, place + 1, source, token)
            name, macro = read.classic() if token.text in _DEFINE else read.command()
            if not (token.text.startswith(r"\provide") and name in macros):
                macros[name] = macro
            place = read.place
        else:
            rest.append(token)
            place += 1
    return rest, macros


@dataclass(slots=True)
class _Definition:
    tokens: Sequence[Token]
    place: int
    source: str
    begin: Token

    def error(self, message: str) -> FormulaError:
        return formula_error(self.source, self.begin.start,
                             f"{self.begin.text} is not well formed: {message}")

    def text(self) -> str:
        return self.tokens[self.place].text if self.place < len(self.tokens) else ""

    def group(self, what: str) -> tuple[Token, ...]:
        if self.text() != "{":
            raise self.error(f"write {what} in braces")
        end = group_end(self.tokens, self.place, self.source)
        inside = tuple(self.tokens[self.place + 1 : end - 1])
        self.place = end
        return inside

    def name(self) -> str:
        if self.text() == "{":
            inside = self.group("the name")
            found = inside[0].text if len(inside) == 1 else ""
        else:
            found = self.text()
            self.place += 1
        if not found.startswith("\\"):
            raise self.error(r"the name of a macro is a control word such as \kon")
        return found

    def option(self) -> tuple[Token, ...] | None:
        if self.text() != "[":
            return None
        start = self.place + 1
        for place in range(start, len(self.tokens)):
            if self.tokens[place].text == "]":
                self.place = place + 1
                return tuple(self.tokens[start:place])
        raise self.error("'[' is never closed; write the missing ]")

    def command(self) -> tuple[str, Macro]:
        operator = self.begin.text in _OPERATORS
        if operator and self.text() == "*":
            self.place += 1
        name = self.name()
        count = None if operator else self.option()
        default = None if count is None else self.option()
        digits = "".join(token.text for token in count or ())
        if count is not None and not (len(digits) == 1 and digits in "0123456789"):
            raise self.error("the number of arguments is one digit, as in [2]")
        body = self.group("the body")
        if operator:
            start, end = self.begin.start, self.begin.end
            wrap = [Token(t, start, end) for t in (r"\operatorname", "{", "}")]
            body = (*wrap[:2], *body, wrap[2])
        return name, self.checked(Macro(int(digits or "0"), body, default))

    def classic(self) -> tuple[str, Macro]:
        name = self.name()
        count = 0
        while self.text() == "#":
            count += 1
            self.place += 1
            if self.text() != str(count):
                raise self.error("its parameters are #1, #2, ... and nothing between them")
            self.place += 1
        if self.text() != "{":
            raise self.error(r"delimited parameters are not read; write \newcommand")
        return name, self.checked(Macro(count, self.group("the body")))

    def checked(self, macro: Macro) -> Macro:
        known = {str(n) for n in range(1, macro.parameters + 1)}
        for place, token in enumerate(macro.body):
            if token.text != "#":
                continue
            after = macro.body[place + 1].text if place + 1 < len(macro.body) else ""
            if after not in known:
                raise self.error(f"#{after} stands for no argument; it has {macro.parameters}")
        return macro


def expand(
    tokens: Sequence[Token], macros: Mapping[str, Macro], source: str
) -> list[Token]:
    """Return the tokens with all macros expanded, those inside bodies and arguments too.

    Raises FormulaError at the call where expanding does not end within 20,000 calls or 2,000,000
    tokens, or where an argument is missing.
    """
    if not macros:
        return list(tokens)
    pending = list(reversed(tokens))
    done: list[Token] = []
    calls = made = 0
    while pending:
        token = pending.pop()
        macro = macros.get(token.text)
        if macro is None:
            done.append(token)
            continue
        arguments = _arguments(token, macro, pending, source)
        calls, made = calls + 1, made + _length(macro, arguments)
        if calls > MAX_EXPANSIONS or made > MAX_TOKENS:
            raise formula_error(
                source, token.start,
                f"the macro {token.text} does not come to an end: more than {MAX_EXPANSIONS} calls"
                f" or {MAX_TOKENS} tokens; it uses itself or grows too fast, write it out",
            )
        pending.extend(reversed(_expanded(token, macro, arguments)))
    return done


def _arguments(
    token: Token, macro: Macro, pending: list[Token], source: str
) -> list[tuple[Token, ...]]:
    """Take the arguments of a call from ``pending`` (next token last)."""
    arguments: list[tuple[Token, ...]] = []
    if macro.default is not None:
        given = _taken_option(token, pending, source)
        arguments.append(macro.default if given is None else given)
    while len(arguments) < macro.parameters:
        arguments.append(_taken(token, pending, source, macro.parameters))
    return arguments


def _length(macro: Macro, arguments: list[tuple[Token, ...]]) -> int:
    length = len(macro.body)
    for place, token in enumerate(macro.body):
        if token.text == "#":
            length += len(arguments[int(macro.body[place + 1].text) - 1])
    return length


def _expanded(token: Token, macro: Macro, arguments: list[tuple[Token, ...]]) -> list[Token]:
    body: list[Token] = []
    inside = iter(macro.body)
    for part in inside:
        if part.text == "#":
            body.extend(arguments[int(next(inside).text) - 1])
        else:
            body.append(replace(part, start=token.start, end=token.end))
    if body and token.space:
        body[0] = replace(body[0], space=True)
    return body


def _taken(call: Token, pending: list[Token], source: str, count: int) -> tuple[Token, ...]:
    if not pending or pending[-1].text == "}":
        raise formula_error(source, call.start,
                            f"the macro {call.text} takes {count} arguments; write them in braces")
    first = pending.pop()
    if first.text != "{":
        return (first,)
    inside: list[Token] = []
    depth = 1
    while pending:
        token = pending.pop()
        depth += {"{": 1, "}": -1}.get(token.text, 0)
        if depth == 0:
            return tuple(inside)
        inside.append(token)
    raise formula_error(source, first.start, "'{' is never closed; write the missing }")


def _taken_option(call: Token, pending: list[Token], source: str) -> tuple[Token, ...] | None:
    if not pending or pending[-1].text != "[":
        return None
    opening = pending.pop()
    inside: list[Token] = []
    depth = 0
    while pending:
        token = pending.pop()
        if token.text == "]" and depth == 0:
            return tuple(inside)
        depth += {"{": 1, "}": -1}.get(token.text, 0)
        inside.append(token)
    raise formula_error(source, opening.start,
                        f"the option of {call.text} is never closed; write the missing ]")
