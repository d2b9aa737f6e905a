r"""What a formula may name: the symbols of a network and its quantities, by their LaTeX.

Names are compared as canonical items, exactly first, then without fonts where that leaves one
meaning; of several names that fit, the longest counts. Letters are those of the notation of the
network; the other letters of a role (``p`` for ``\pi``) count where no symbol and no other role has
them. Labels are those of the notation, the default ones and the plain names.
"""

from __future__ import annotations

import difflib
from collections.abc import Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass, field, replace

from symbolic_response.errors import ExpressionError, FormulaError, SymbolicResponseError
from symbolic_response.expressions.names import base_latex, default_latex, same_latex, upright
from symbolic_response.expressions.tree import Expression, Symbol, add, negate
from symbolic_response.hand.latex.items import (
    Item,
    Items,
    bracketed,
    items_of,
    key_of,
    without_fonts,
)
from symbolic_response.hand.latex.pieces import numeric
from symbolic_response.hand.latex.table import (
    CHOSEN,
    SYMBOL,
    Builder,
    Match,
    Table,
    loose_key,
    split_at,
)
from symbolic_response.hand.latex.tokens import Token, tokenize
from symbolic_response.network.model import Network
from symbolic_response.network.notation_section import LETTERS, plain_symbol_names
from symbolic_response.network.quantities import (
    BarrierOf,
    BarriersOf,
    BySymbol,
    Current,
    DirectedRate,
    DriveOf,
    EnergyOf,
    EntropyProduction,
    Mean,
    Perturbation,
    Probability,
    Traffic,
)
from symbolic_response.response.notation import Notation, joined, notation_of


@dataclass(frozen=True, slots=True)
class Names:
    """The names of a network, of its perturbations, and those defined in a text.

    ``probability``, ``current`` and ``barrier``: the keys of the letters of these roles, the
    first and the last take a set of states or of transitions as index; ``beta``: the inverse
    temperature, if it is written. ``refused``: names that a text gives no one meaning, with the
    reason. ``own``: the perturbations that the derivative by a symbol is;
    ``twofold``: those of these symbols that are written like the perturbation itself.
    """

    values: Table
    perturbations: Table
    own: Mapping[str, Perturbation]
    twofold: frozenset[str]
    probability: frozenset[str]
    current: frozenset[str]
    barrier: frozenset[str]
    states: Table
    transitions: Table
    positive: frozenset[str]
    beta: str
    refused: Table = field(default_factory=Table)

    def match(self, items: Items, place: int = 0) -> Match | None:
        """Return the longest quantity or symbol that begins at a place."""
        found = self.values.match(items, place)
        return found or self._of_a_set(items[place], self.probability, self.states)

    def perturbation(self, items: Items, place: int = 0) -> Match | None:
        """Return the longest name of a perturbation that begins at a place."""
        found = self.perturbations.match(items, place)
        if found is None and self.beta and key_of(items[place : place + 1]) == self.beta:
            behind = items[place + 1 : place + 2]
            several = self._of_a_set(behind[0], self.barrier, self.transitions) if behind else None
            return several and replace(several, count=2)
        return found or self._of_a_set(items[place], self.barrier, self.transitions)

    def _of_a_set(self, item: Item, letters: frozenset[str], labels: Table) -> Match | None:
        r"""Read ``\pi_{\{A,B\}}`` or ``B_{\{a,b\}}``."""
        below = item.below
        letter = key_of([replace(item, below=None, above=None)])
        if letter not in letters or not below or not _in_braces(below):
            return None
        places: set[int] = set()
        for member in split_at(below[1:-1], ","):
            found = labels.match(member) if member else None
            if found is None or found.count != len(member) or found.power is not None:
                return None
            if len(found.meanings) != 1 or found.meanings[0] in places:
                return None
            meaning = found.meanings[0]
            assert isinstance(meaning, int)
            places.add(meaning)
        chosen = tuple(sorted(places))
        value: object = Probability(chosen)
        if labels is self.transitions:
            value = BarrierOf(chosen[0]) if len(chosen) == 1 else BarriersOf(chosen)
        return Match(1, (value,), key_of([item]), item.above)

    def begins_unknown(self, tokens: Sequence[Token], source: str) -> bool:
        r"""Return whether a formula begins with the letter of probabilities or currents and an
        index or superscript that is not known: ``\pi_X``, ``P_C^{ss}``."""
        try:
            items = items_of(tokens, source)
        except SymbolicResponseError:
            return False
        first = items[0] if items else None
        if first is None or (first.below is None and first.above is None):
            return False
        letter = key_of([replace(first, below=None, above=None, primes=0)])
        found = self.match(items)
        power = found.power if found is not None else None
        known = found is not None and (
            power is None or (numeric(power) and not bracketed(power))
        )
        return letter in self.probability | self.current and not known

    def with_definitions(self, definitions: Mapping[str, Expression]) -> Names:
        """Return the names with further ones, LaTeX to expression.

        They count before the other letters and labels of the network. Raises ExpressionError where
        the network itself has the name, FormulaError for LaTeX that is not well formed.
        """
        builder = Builder()
        builder.take(self.values)
        for latex, value in definitions.items():
            key = key_of(items_of(tokenize(latex), latex))
            entry = self.values.exact.get(key)
            if entry is not None and entry.level <= CHOSEN and entry.meanings != (value,):
                raise ExpressionError(f"{latex} is a name of the network already; define another")
            builder.add(latex, value, SYMBOL)
        return replace(self, values=builder.table())

    def with_refused(self, latex: str, reason: str) -> Names:
        """Return the names with one that a text does not define in one way: uses give the reason.

        Raises FormulaError for LaTeX that is not well formed.
        """
        builder = Builder()
        builder.take(self.refused)
        builder.add(latex, reason, SYMBOL)
        return replace(self, refused=builder.table())

    def refusal(self, items: Items, place: int, found: Match | None) -> str:
        """Return why the name at a place is refused, or nothing; ``found``: the name that is not.

        Of the two the longer name counts.
        """
        lost = self.refused.match(items, place) if self.refused.exact else None
        if lost is None or (found is not None and (
            lost.count < found.count or (lost.power is not None and found.power is None)
        )):
            return ""
        return f"{lost.shown} {lost.meanings[0]}"

    def nearest(self, items: Sequence[Item], *, perturbation: bool = False) -> str:
        """Return ``"; did you mean k_{on}?"`` for the known name closest to items, or a list."""
        table = self.perturbations if perturbation else self.values
        known = {key: entry.shown for key, entry in table.loose.items() if entry.level <= CHOSEN}
        wanted = key_of(without_fonts(items))
        alike = [key for key in known if items and key.startswith(without_fonts(items)[0].head)]
        found: list[str] = []
        if len(wanted) < 100:
            found = (difflib.get_close_matches(wanted, alike, n=1, cutoff=0.3)
                     or difflib.get_close_matches(wanted, list(known), n=1))
        if found:
            return f"; did you mean {known[found[0]]}?"
        shown = list(dict.fromkeys(known.values()))
        more = ", ..." if len(shown) > 8 else ""
        return f"; known: {', '.join(shown[:8])}{more}" if shown else ""


def _in_braces(items: Items) -> bool:
    return items[0].head == r"\{" and items[-1].head == r"\}"


def names_of(
    network: Network, notation: Notation | None = None, *, variants: bool = True
) -> Names:
    r"""Return the names of a network, in its own notation if none is given.

    Without ``variants`` only letters and labels as the notation writes them are known.
    Raises NetworkError where the section ``[notation]`` cannot be used, FormulaError where the
    LaTeX of a symbol is not well formed.
    """
    return _Writer(network, notation or notation_of(network), variants).names()


@dataclass(slots=True)
class _Writer:
    """Writes every name of a network in all letters and labels that are accepted."""

    network: Network
    notation: Notation
    variants: bool
    values: Builder = field(default_factory=Builder)
    by: Builder = field(default_factory=Builder)

    def names(self) -> Names:
        for name, latex in self.notation.symbols.items():
            try:
                self.values.add(latex, Symbol(name), SYMBOL)
            except FormulaError as error:
                raise FormulaError(error.message, error.line, error.column, error.excerpt,
                                   error.pointer, f"the LaTeX of symbol {name!r}") from None
            self.by.add(latex, BySymbol(name), SYMBOL)
        states = [self.state_labels(k) for k in range(len(self.network.states))]
        transitions = [self.transition_labels(e) for e in range(len(self.network.transitions))]
        self.quantities(states, transitions)
        if self.variants:
            self.generators(states)
        self.raised(states, transitions)
        own = {name: perturbation for perturbation, name in self.notation.own.items()}
        return Names(
            values=self.values.table(),
            perturbations=self.by.table(),
            own=own,
            twofold=frozenset(name for name, by in own.items() if self.is_twofold(name, by)),
            probability=self.letter_keys("probability"),
            current=self.letter_keys("current"),
            barrier=self.letter_keys("barrier"),
            states=_label_table(states),
            transitions=_label_table(transitions),
            positive=self.network.positive_symbols,
            beta=key_of(items_of(tokenize(self.notation.beta), self.notation.beta)),
        )

    def is_twofold(self, name: str, by: Perturbation) -> bool:
        match by:
            case EnergyOf(place):
                role, label = "energy", self.notation.states[place]
            case BarrierOf(place):
                role, label = "barrier", self.notation.transitions[place]
            case DriveOf(place):
                role, label = "drive", self.notation.transitions[place]
            case _:
                return False
        written = self.notation.indexed(role, label)
        return loose_key(plain_symbol_names(self.network)[name]) == loose_key(written)

    def letters(self, role: str) -> Iterator[tuple[str, int]]:
        """Yield the letter of a role, then the others that nothing else has."""
        chosen = self.notation.letters[role]
        yield chosen, 0
        if not self.variants:
            return
        taken = {same_latex(base_latex(t)) for t in plain_symbol_names(self.network).values()}
        taken |= {same_latex(letter) for letter in self.notation.letters.values()}
        if self.notation.beta:
            taken.add(same_latex(self.notation.beta))
        for letter in LETTERS[role]:
            if same_latex(letter) not in taken:
                yield letter, 2

    def letter_keys(self, role: str) -> frozenset[str]:
        return frozenset(key_of(items_of(tokenize(letter), letter))
                         for letter, _ in self.letters(role))

    def state_labels(self, place: int) -> list[tuple[str, int]]:
        state = self.network.states[place]
        if not self.variants:
            return [(self.notation.states[place], 0)]
        own = state.latex or default_latex(state.name)
        return _labels(self.notation.states[place], own, default_latex(state.name),
                       upright(state.name))

    def transition_labels(self, place: int) -> list[tuple[str, int]]:
        name = self.network.transitions[place].name
        if not self.variants:
            return [(self.notation.transitions[place], 0)]
        return _labels(self.notation.transitions[place], upright(name))

    def quantities(
        self, states: list[list[tuple[str, int]]], transitions: list[list[tuple[str, int]]]
    ) -> None:
        one_way = any(each.backward is None for each in self.network.transitions)
        for letter, other in () if one_way else self.letters("entropy"):
            self.values.try_add(letter, EntropyProduction(), CHOSEN + other)
        for place, observable in enumerate(self.network.observables):
            for label, other in _labels(self.notation.observables[place],
                                        default_latex(observable.name), upright(observable.name)):
                self.values.try_add(rf"\langle {label} \rangle", Mean(place), CHOSEN + other)
        self.indexed(self.values, "probability", states, lambda k: Probability((k,)))
        self.indexed(self.values, "current", transitions, Current)
        self.indexed(self.values, "traffic", transitions, Traffic)
        for e, labels in enumerate(transitions):
            for backward, sign in ((False, "+"), (True, "-")):
                rate = DirectedRate(e, backward)
                self.values.try_add(self.notation.rate(e, backward), rate, CHOSEN)
                for letter, other in self.letters("rate"):
                    for label, variant in labels:
                        self.values.try_add(f"{letter}_{{{label}}}^{{{sign}}}", rate,
                                            CHOSEN + other + variant)

    def indexed(
        self, table: Builder, role: str, labels: list[list[tuple[str, int]]], value: object
    ) -> None:
        assert callable(value)
        for letter, other in self.letters(role):
            for place, variants in enumerate(labels):
                for label, variant in variants:
                    table.try_add(f"{letter}_{{{label}}}", value(place), CHOSEN + other + variant)

    def generators(self, states: list[list[tuple[str, int]]]) -> None:
        """Add W_ij, the rate from j to i summed over parallel channels, and W_ii.

        Where the notation asks for it also w_ij, the rate from i to j.
        """
        size = len(states)
        into: dict[tuple[int, int], list[Expression]] = {(k, k): [] for k in range(size)}
        for e, transition in enumerate(self.network.transitions):
            ends = (transition.first, transition.second)
            for backward, (source, target) in ((False, ends), (True, ends[::-1])):
                rate = DirectedRate(e, backward)
                into.setdefault((target, source), []).append(rate)
                into[source, source].append(negate(rate))
        for (target, source), rates in into.items():
            self.between("generator", (target, source), r" \leftarrow ", states, add(rates))
            if self.notation.indices == "from-to":
                self.between("rate", (source, target), r" \to ", states, add(rates))

    def between(
        self, role: str, pair: tuple[int, int], arrow: str, states: list[list[tuple[str, int]]],
        value: Expression,
    ) -> None:
        """Add a letter with two states as its index, in all labels that they have."""
        for letter, other in self.letters(role):
            for first, one in states[pair[0]]:
                for second, two in states[pair[1]]:
                    if one != two and len(states[pair[0]]) == len(states[pair[1]]):
                        continue  # nobody mixes two kinds of labels
                    level = CHOSEN + max(other, one, two)
                    shown = {joined([first, second]): level, f"{first},{second}": level + 1,
                             first + arrow + second: level + 1}
                    for label, rank in shown.items():
                        self.values.try_add(f"{letter}_{{{label}}}", value, rank)

    def raised(
        self, states: list[list[tuple[str, int]]], transitions: list[list[tuple[str, int]]]
    ) -> None:
        kinds = (("energy", states, EnergyOf), ("barrier", transitions, BarrierOf),
                 ("drive", transitions, DriveOf))
        for role, labels, kind in kinds:
            self.indexed(self.by, role, labels, kind)
            for place, variants in enumerate(labels if self.notation.beta else ()):
                for label, variant in variants:
                    latex = f"{self.notation.beta} {self.notation.indexed(role, label)}"
                    self.by.try_add(latex, kind(place), CHOSEN + variant)


def _labels(first: str, *others: str) -> list[tuple[str, int]]:
    """Return a label and those variants that differ in more than fonts, with how much later
    each counts."""
    found = {loose_key(label): (label, 1) for label in reversed(others)}
    found.pop(loose_key(first), None)
    return [(first, 0), *found.values()]


def _label_table(labels: Iterable[list[tuple[str, int]]]) -> Table:
    builder = Builder()
    for place, variants in enumerate(labels):
        for label, variant in variants:
            builder.try_add(label, place, variant)
    return builder.table()
