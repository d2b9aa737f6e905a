"""Reading quantities and responses as they are written on paper.

``p[A, B]``, ``mean[name]``, ``current[e]``, ``traffic[e]``, ``forward[e]``, ``backward[e]``,
``entropy_production`` and expressions of them; ``d QUANTITY / d PERTURBATION`` for a response,
which is the whole quantity or stands in parentheses; ``change(QUANTITY, barrier[e], AMOUNT)``.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace
from fractions import Fraction

from symbolic_response.errors import ExpressionError, QuantityError, SymbolicResponseError
from symbolic_response.expressions.hyperbolic import HYPERBOLIC, hyperbolic
from symbolic_response.expressions.reader import Token, no_atoms, read_tokens, tokenize
from symbolic_response.expressions.tree import Expression, function, power, symbols_of
from symbolic_response.network.model import Network, nearest
from symbolic_response.network.quantities import (
    BarrierOf,
    BarriersOf,
    BySymbol,
    Change,
    Current,
    DirectedRate,
    DriveOf,
    EnergyOf,
    EntropyProduction,
    Mean,
    Perturbation,
    Probability,
    Response,
    Traffic,
    walk_quantity,
)

MAX_RESPONSE_DEPTH = 6
_SHOWN = 60
_ATOMS = ("p", "mean", "current", "traffic", "forward", "backward")
_ONLY_IN_INEQUALITIES = ("force_max", "max_cov", "tanh", "abs", "max", "min")
_FUNCTIONS = ("exp", "ln", "sqrt")
_OPENING, _CLOSING = ("(", "["), (")", "]")


def read_quantity(text: str, network: Network, *, hyperbolic: bool = False) -> Expression:
    """Return the quantity or response that ``text`` describes, for this network.

    ``hyperbolic``: tanh, sinh, cosh and coth may occur, which are written with exponentials.
    Raises QuantityError, in one line, with the position where reading stopped.
    """
    try:
        tokens = tokenize(text)
        quantity = _Reader(network, 0, hyperbolic=hyperbolic).read(tokens)
    except ExpressionError as error:
        raise QuantityError(f"in {_excerpt(text, error.position)}: {error}") from None
    except QuantityError as error:
        raise QuantityError(f"in {_excerpt(text, None)}: {error}") from None
    return quantity


def read_perturbation(text: str, network: Network) -> Perturbation:
    """Return the perturbation that ``text`` names, such as ``barrier[bind]`` or ``ln c``."""
    try:
        return _Reader(network, 0).perturbation(tokenize(text))
    except SymbolicResponseError as error:
        raise QuantityError(f"in {_excerpt(text, None)}: {error}") from None


def _excerpt(text: str, position: int | None) -> str:
    flat = " ".join(text.split()) if position is None else text.replace("\n", " ")
    if position is None or position <= 0:
        return repr(flat if len(flat) <= _SHOWN else flat[:_SHOWN] + "...")
    start = max(0, position - _SHOWN // 2)
    shown = ("..." if start else "") + flat[start : start + _SHOWN]
    shown += "..." if start + _SHOWN < len(flat) else ""
    return f"{shown!r}, character {position + 1}"


@dataclass(frozen=True, slots=True)
class _Reader:
    network: Network
    depth: int
    in_change: bool = False
    hyperbolic: bool = False

    def read(self, tokens: list[Token]) -> Expression:
        """Read a whole token list as a response or as an expression of atoms."""
        if _is_d(tokens[0]):
            return self.response(tokens)
        quantity = read_tokens(tokens, self.atom)
        self.check_symbols(quantity, tokens)
        return quantity

    def atom(self, tokens: list[Token], index: int) -> tuple[Expression, int] | None:
        token = tokens[index]
        if token.text == "(" and _is_d(tokens[index + 1]):
            return self.response_in_parentheses(tokens, index)
        if token.kind != "name":
            return None
        if token.text in _FUNCTIONS and tokens[index + 1].text == "(" and _is_d(tokens[index + 2]):
            argument, after = self.response_in_parentheses(tokens, index + 1)
            return _applied(token.text, argument), after
        if _is_d(token):
            raise ExpressionError(
                "a response is the whole quantity or stands in parentheses: (d ... / d ...)",
                token.position,
            )
        if token.text == "change" and tokens[index + 1].text == "(":
            return self.change(tokens, index)
        if token.text == "entropy_production":
            self.check_reversible()
            return EntropyProduction(), index + 1
        if token.text in _ATOMS:
            return self.bracketed(tokens, index)
        if self.hyperbolic and token.text in HYPERBOLIC and tokens[index + 1].text == "(":
            closing = _matching(tokens, index + 1)
            inner = [*tokens[index + 2 : closing], Token("end", "", tokens[closing].position)]
            return hyperbolic(token.text, read_tokens(inner, self.atom)), closing + 1
        if token.text in _ONLY_IN_INEQUALITIES:
            raise ExpressionError(f"{token.text!r} belongs in an inequality", token.position)
        return None

    def response_in_parentheses(
        self, tokens: list[Token], index: int
    ) -> tuple[Expression, int]:
        closing = _matching(tokens, index)
        inner = [*tokens[index + 1 : closing], Token("end", "", tokens[closing].position)]
        return self.response(inner), closing + 1

    def bracketed(self, tokens: list[Token], index: int) -> tuple[Expression, int]:
        kind = tokens[index].text
        names, after = _names_in_brackets(tokens, index + 1, kind)
        network = self.network
        if kind == "p":
            states = tuple(network.state_index(name) for name in names)
            if len(set(states)) != len(states):
                raise ExpressionError("a state is named twice", tokens[index].position)
            return Probability(tuple(sorted(states))), after
        if len(names) != 1:
            raise ExpressionError(f"{kind}[...] takes one name", tokens[index].position)
        if kind == "mean":
            known = [observable.name for observable in network.observables]
            return Mean(known.index(network.observable(names[0]).name)), after
        transition = network.transition_index(names[0])
        makers: dict[str, Callable[[], Expression]] = {
            "current": lambda: Current(transition),
            "traffic": lambda: Traffic(transition),
            "forward": lambda: DirectedRate(transition, False),
            "backward": lambda: DirectedRate(transition, True),
        }
        return makers[kind](), after

    def change(self, tokens: list[Token], index: int) -> tuple[Expression, int]:
        """Read ``change(QUANTITY, barrier[e], AMOUNT)``."""
        self.check_not_in_change(tokens[index])
        closing = _matching(tokens, index + 1)
        parts = _split_at_commas(tokens[index + 2 : closing], tokens[closing].position)
        if len(parts) != 3:
            raise ExpressionError("write change(QUANTITY, barrier[transition], AMOUNT)",
                                  tokens[index].position)
        quantity = replace(self, in_change=True).read(parts[0])
        by = self.perturbation(parts[1])
        if not isinstance(by, BarrierOf):
            raise ExpressionError("the second entry of change(...) is one barrier:"
                                  " barrier[transition]", parts[1][0].position)
        amount = read_tokens(parts[2], no_atoms)
        self.check_symbols(amount, parts[2])
        return Change(quantity, by.transition, amount), closing + 1

    def check_not_in_change(self, token: Token) -> None:
        if self.in_change:
            raise ExpressionError("change(...) takes a quantity without responses or changes",
                                  token.position)

    def response(self, tokens: list[Token]) -> Expression:
        self.check_not_in_change(tokens[0])
        if self.depth >= MAX_RESPONSE_DEPTH:
            raise ExpressionError(
                f"responses nested more than {MAX_RESPONSE_DEPTH} deep", tokens[0].position
            )
        known = [entry.name for entry in self.network.symbols]
        slash = _last_slash_before_d(tokens, {*known, "ln", "energy", "barrier", "drive"})
        end = Token("end", "", tokens[slash].position)
        inner = _Reader(self.network, self.depth + 1)
        quantity = inner.numerator([*tokens[1:slash], end])
        if any(isinstance(part, Change) for part in walk_quantity(quantity)):
            raise ExpressionError("change(...) has no responses; ask for the change alone",
                                  tokens[0].position)
        return Response(quantity, self.perturbation(tokens[slash + 2 :]))

    def numerator(self, tokens: list[Token]) -> Expression:
        if _is_d(tokens[0]):
            raise ExpressionError(
                "put the inner response in parentheses: d (d ... / d ...) / d ...",
                tokens[0].position,
            )
        if tokens[0].text == "ln" and tokens[1].text != "(":
            if (operator := _top_level_operator(tokens[1:])) is not None:
                raise ExpressionError(
                    "a bare ln takes a single quantity; write ln(...) around what it applies to",
                    operator.position,
                )
            return function("ln", self.read(tokens[1:]))
        return self.read(tokens)

    def perturbation(self, tokens: list[Token]) -> Perturbation:
        first = tokens[0]
        if first.text in ("energy", "barrier", "drive"):
            names, after = _names_in_brackets(tokens, 1, first.text)
            _expect_end(tokens, after)
            return self.elementary(first, names)
        logarithmic = first.text == "ln"
        rest = tokens[1:] if logarithmic else tokens
        if logarithmic and rest[0].text == "(" and len(rest) > 2 and rest[2].text == ")":
            rest = [rest[1], *rest[3:]]
        if first.text == "log" and tokens[1].kind != "end":
            named = next((t.text for t in tokens[1:] if t.kind == "name"), "c")
            raise ExpressionError(f"write d / d ln {named}, not log", first.position)
        if rest[0].kind != "name":
            raise ExpressionError(
                "a perturbation is energy[state], barrier[transition], barrier[several, of, them],"
                " drive[transition], a symbol, or ln of a positive symbol",
                rest[0].position,
            )
        _expect_end(rest, 1)
        return self.symbol_perturbation(rest[0], logarithmic)

    def elementary(self, kind: Token, names: list[str]) -> Perturbation:
        """Return the energy, barrier or drive that is named, or several barriers together."""
        for name in names:
            self.check_kind(kind, name)
        if kind.text != "barrier" and len(names) != 1:
            hint = "; barriers are raised together by barrier[a, b]" if kind.text == "drive" else ""
            raise ExpressionError(f"{kind.text}[...] takes one name{hint}", kind.position)
        if kind.text == "energy":
            return EnergyOf(self.network.state_index(names[0]))
        chosen = sorted(self.network.transition_index(name) for name in names)
        if kind.text == "drive":
            return DriveOf(chosen[0])
        if len(set(chosen)) != len(chosen):
            raise ExpressionError("a transition is named twice", kind.position)
        return BarrierOf(chosen[0]) if len(chosen) == 1 else BarriersOf(tuple(chosen))

    def check_kind(self, kind: Token, name: str) -> None:
        """Say so where a state stands for a transition or the other way round."""
        states = [state.name for state in self.network.states]
        transitions = [transition.name for transition in self.network.transitions]
        if kind.text == "energy" and name in transitions and name not in states:
            raise ExpressionError(f"{name!r} is a transition; energy takes a state", kind.position)
        if kind.text != "energy" and name in states and name not in transitions:
            raise ExpressionError(
                f"{name!r} is a state; {kind.text} takes a transition", kind.position
            )

    def symbol_perturbation(self, token: Token, logarithmic: bool) -> Perturbation:
        entry = self.network.symbol(token.text)
        if logarithmic and not entry.positive:
            raise ExpressionError(
                f"d / d ln {entry.name} needs a positive symbol; write d / d {entry.name}",
                token.position,
            )
        return BySymbol(entry.name, logarithmic)

    def check_symbols(self, quantity: Expression, tokens: list[Token]) -> None:
        known = [entry.name for entry in self.network.symbols]
        unknown = symbols_of(quantity) - set(known)
        for token in tokens:
            if token.kind == "name" and token.text in unknown:
                raise ExpressionError(
                    f"unknown symbol {token.text!r}"
                    + (nearest(token.text, known) or self.atom_hint(token.text)),
                    token.position,
                )

    def atom_hint(self, name: str) -> str:
        if name in [state.name for state in self.network.states]:
            return f"; write p[{name}] for the probability of that state"
        if name in [observable.name for observable in self.network.observables]:
            return f"; write mean[{name}] for that observable"
        if name in [transition.name for transition in self.network.transitions]:
            return f"; write current[{name}] for the current of that transition"
        return nearest(name, [*_ATOMS, "entropy_production"])

    def check_reversible(self) -> None:
        for transition in self.network.transitions:
            if transition.backward is None:
                raise QuantityError(
                    f"entropy_production does not exist: transition {transition.name!r} is one-way"
                )


def _applied(name: str, argument: Expression) -> Expression:
    return power(argument, Fraction(1, 2)) if name == "sqrt" else function(name, argument)


def _is_d(token: Token) -> bool:
    return token.kind == "name" and token.text == "d"


def _names_in_brackets(tokens: list[Token], index: int, kind: str) -> tuple[list[str], int]:
    if tokens[index].text != "[":
        message = f"{kind} needs a name in brackets: {kind}[...]"
        raise ExpressionError(message, tokens[index].position)
    names: list[str] = []
    while True:
        index += 1
        if tokens[index].kind != "name":
            raise ExpressionError(f"a name is expected in {kind}[...]", tokens[index].position)
        names.append(tokens[index].text)
        index += 1
        if tokens[index].text == "]":
            return names, index + 1
        if tokens[index].text != ",":
            raise ExpressionError(f"{kind}[...] is not closed by ]", tokens[index].position)


def _split_at_commas(tokens: list[Token], end: int) -> list[list[Token]]:
    """Return what stands between the commas outside of all brackets, each closed by an end."""
    parts: list[list[Token]] = [[]]
    top = set(_top_level(tokens))
    for place, token in enumerate(tokens):
        if token.text == "," and place in top:
            parts[-1].append(Token("end", "", token.position))
            parts.append([])
        else:
            parts[-1].append(token)
    parts[-1].append(Token("end", "", end))
    return parts


def _matching(tokens: list[Token], index: int) -> int:
    depth = 0
    for place in range(index, len(tokens)):
        if tokens[place].text in _OPENING:
            depth += 1
        elif tokens[place].text in _CLOSING:
            depth -= 1
            if depth == 0:
                return place
    raise ExpressionError("an opening parenthesis is never closed", tokens[index].position)


def _top_level(tokens: list[Token]) -> list[int]:
    depth, places = 0, []
    for place, token in enumerate(tokens):
        if token.text in _OPENING:
            depth += 1
        elif token.text in _CLOSING:
            depth -= 1
        elif depth == 0:
            places.append(place)
    return places


def _last_slash_before_d(tokens: list[Token], known: set[str]) -> int:
    for place in reversed(_top_level(tokens)):
        if tokens[place].text == "/" and _is_d(tokens[place + 1]):
            return place
    for place in reversed(_top_level(tokens)):
        after = tokens[min(place + 1, len(tokens) - 1)]
        if tokens[place].text == "/" and after.text[:1] == "d" and after.text[1:] in known:
            raise ExpressionError(
                f"write d {after.text[1:]}, with a space, not {after.text}", after.position
            )
    raise ExpressionError(
        "a response needs ' / d PERTURBATION', as in d p[A] / d ln c", tokens[-1].position
    )


def _top_level_operator(tokens: list[Token]) -> Token | None:
    for place in _top_level(tokens):
        if tokens[place].kind == "op" and tokens[place].text != ",":
            return tokens[place]
    return None


def _expect_end(tokens: list[Token], index: int) -> None:
    if tokens[index].kind != "end":
        raise ExpressionError(
            f"{tokens[index].text!r} cannot follow a perturbation; put a response in parentheses"
            " to go on with it",
            tokens[index].position,
        )
