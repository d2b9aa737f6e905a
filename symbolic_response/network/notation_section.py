r"""The section ``[notation]`` of a network file: how the network is to be written.

==============  ==================================================================================
``letters``     a table from roles (``probability``, ``current``, ``rate``, ``tree_sum``, ...) to
                LaTeX letters; a letter that is the base of a symbol or of another role is refused
``states``      a table from names of states to their labels; ``transitions``, ``observables`` too
``indices``     what a rate carries: ``"transition"`` (default), ``"to-from"`` (W_ij is the rate
                from j to i) or ``"from-to"`` (w_ij is the rate from i to j)
``rates``       whether results are written in rates: ``"expressions"`` (default: in the symbols of
                the file), ``"symbols"`` (in rates) or ``"shorter"`` (whichever is)
``beta``        true, or a letter: energies, barriers and drives are written times the inverse
                temperature instead of in units of k_B T
==============  ==================================================================================
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field

from symbolic_response.errors import NetworkError
from symbolic_response.expressions.names import base_latex, default_latex, same_latex, upright
from symbolic_response.expressions.tree import Number, Product, Sum, Symbol
from symbolic_response.network.entries import (
    DocumentError,
    check_keys,
    read_latex,
    shown,
    table_of,
)
from symbolic_response.network.model import Network
from symbolic_response.network.toml_reader import place_in_file

LETTERS = {
    "probability": (r"\pi", "p", "P", r"\varpi"),
    "current": ("J", "I", "j", r"\mathcal{J}"),
    "traffic": (r"\tau", "A", r"\mathcal{T}", r"\vartheta"),
    "rate": ("w", r"\omega", "r", r"\varrho"),
    "generator": ("W", r"\mathbf{W}", r"\mathcal{W}", r"\Omega"),
    "entropy": (r"\sigma", r"\Sigma", r"\dot{S}", r"\varsigma"),
    "energy": ("E", r"\varepsilon", r"\epsilon", r"\mathcal{E}"),
    "barrier": ("B", r"\beta", "b", r"\mathcal{B}"),
    "drive": ("F", r"\phi", "f", r"\varphi"),
    "tree sum": ("N", "M", r"\mathcal{N}", r"\nu"),
    "normalisation": ("D", "Z", r"\mathcal{D}", r"\zeta"),
    "current numerator": ("C", "Y", r"\mathcal{C}", r"\gamma"),
    "traffic numerator": ("T", "H", r"\Theta", r"\mathcal{H}"),
    "forest": (r"\Phi", r"\Psi", r"\Xi", r"\Upsilon"),
    "remainder": ("R", "X", r"\mathcal{R}", r"\rho"),
    "force": (r"\mathcal{F}", r"\mathcal{A}", r"\mathbf{F}", r"\Lambda"),
    "factor": ("g", "G", r"\mathcal{G}", r"\kappa"),
    "quantity": ("Q", "U", r"\mathcal{Q}", r"\mathbf{Q}"),
}
"""For each role the letters it may take, the first that no symbol uses being taken."""

INDICES = ("transition", "to-from", "from-to")
IN_RATES = {"expressions": "never", "symbols": "always", "shorter": "shorter"}
_KEYS = ("letters", "states", "transitions", "observables", "indices", "rates", "beta")


@dataclass(frozen=True, slots=True)
class NotationSection:
    """What the section asks for; empty where it says nothing."""

    letters: Mapping[str, str] = field(default_factory=dict)
    states: Mapping[str, str] = field(default_factory=dict)
    transitions: Mapping[str, str] = field(default_factory=dict)
    observables: Mapping[str, str] = field(default_factory=dict)
    indices: str = "transition"
    rates: str = "never"
    beta: str = ""


def read_notation(network: Network) -> NotationSection:
    """Return the section of a network; NetworkError, with file and line, if it cannot be used."""
    try:
        return _section(network)
    except DocumentError as error:
        raise NetworkError(f"{place_in_file(network.path, error.place)}: {error}") from None


def _section(network: Network) -> NotationSection:
    table = network.notation
    if not table:
        return NotationSection()
    check_keys(table, _KEYS, "notation", ("notation",))
    return NotationSection(
        letters=_letters(network),
        states=_labels(network, "states", {s.name: s.latex or default_latex(s.name)
                                           for s in network.states}),
        transitions=_labels(network, "transitions", {t.name: upright(t.name)
                                                     for t in network.transitions}),
        observables=_labels(network, "observables", {o.name: default_latex(o.name)
                                                     for o in network.observables}),
        indices=_choice(table, "indices", INDICES),
        rates=IN_RATES[_choice(table, "rates", tuple(IN_RATES))],
        beta=_beta(network),
    )


def _choice(table: Mapping[str, object], key: str, known: tuple[str, ...]) -> str:
    value = table.get(key, known[0])
    if value not in known:
        words = " or ".join(f'"{word}"' for word in known)
        raise DocumentError(f"notation: {key} is {shown(value)}; write {words}", "notation", key)
    return str(value)


def _labels(network: Network, kind: str, defaults: Mapping[str, str]) -> dict[str, str]:
    """Return the labels asked for; ``defaults``: those that names have without the section."""
    place = ("notation", kind)
    table = table_of(network.notation.get(kind, {}), f"notation: {kind}", place)
    check_keys(table, defaults, f"notation: {kind}", place, "name")
    found = {name: _latex(table[name], f"notation: {kind}: {name}", (*place, name))
             for name in table}
    every = {**defaults, **found}
    if found and len({same_latex(label) for label in every.values()}) < len(every):
        raise DocumentError(f"notation: two {kind} have the same label; give each its own", *place)
    return found


def _letters(network: Network) -> dict[str, str]:
    place = ("notation", "letters")
    table = table_of(network.notation.get("letters", {}), "notation: letters", place)
    roles = {role.replace(" ", "_"): role for role in LETTERS}
    check_keys(table, roles, "notation: letters", place, "role")
    found: dict[str, str] = {}
    for key in table:
        letter = _latex(table[key], f"notation: letters: {key}", (*place, key))
        others = [*_plain_bases(network), *found.values()]
        if base_latex(letter) != letter:
            raise DocumentError(f"notation: the letter {shown(letter)} of {key} has an index of its"
                                " own; write a letter without one", *place, key)
        _check_free(letter, key, others, (*place, key))
        found[roles[key]] = letter
    return found


def _plain_bases(network: Network) -> list[str]:
    return [base_latex(latex) for latex in plain_symbol_names(network).values()]


def _check_free(letter: str, what: str, others: Iterable[str], place: tuple[str, ...]) -> None:
    if same_latex(letter) in {same_latex(other) for other in others}:
        raise DocumentError(f"notation: the letter {shown(letter)} of {what} is that of a symbol or"
                            " of another role already; take another", *place)


def _latex(value: object, what: str, place: tuple[str, ...]) -> str:
    try:
        latex = read_latex({"latex": value}, what, place)
    except DocumentError as error:
        raise DocumentError(str(error), *place) from None
    assert latex is not None
    return latex


def _beta(network: Network) -> str:
    value = network.notation.get("beta", False)
    if value is False:
        return ""
    letter = r"\beta" if value is True else _latex(value, "notation: beta", ("notation", "beta"))
    _check_free(letter, "beta", _plain_bases(network), ("notation", "beta"))
    return letter


def energy_symbols(network: Network) -> frozenset[str]:
    """Return the real symbols that are terms of energies, barriers or drives."""
    entries = [s.energy for s in network.states]
    entries += [part for t in network.transitions for part in (t.barrier, t.drive)]
    found: set[str] = set()
    for entry in entries:
        for term in entry.terms if isinstance(entry, Sum) else (entry,):
            factors = term.factors if isinstance(term, Product) else (term,)
            rest = [part for part in factors if not isinstance(part, Number)]
            if len(rest) == 1 and isinstance(rest[0], Symbol):
                found.add(rest[0].name)
    return frozenset(found) - network.positive_symbols


def plain_symbol_names(network: Network) -> dict[str, str]:
    """Return the LaTeX of every symbol by itself."""
    return {entry.name: entry.latex or default_latex(entry.name) for entry in network.symbols}


def symbol_names(network: Network) -> dict[str, str]:
    """Return the LaTeX of every symbol as it stands in formulas: an energy times beta if asked."""
    names = plain_symbol_names(network)
    beta = read_notation(network).beta
    energies = energy_symbols(network) if beta else ()
    return {name: f"{beta} {latex}" if name in energies else latex
            for name, latex in names.items()}
