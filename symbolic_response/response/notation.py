r"""How one network is written: letters by role, labels of states and transitions, symbols.

Letters are chosen for each network so that none of them is also a symbol of the file: where a
symbol prints as :math:`D` or :math:`\pi_A`, the normalisation or the probability takes the next
letter of an ordered list. The section ``[notation]`` of the file goes before
(:mod:`symbolic_response.network.notation_section`).
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Callable, Iterable, Mapping, Sequence
from dataclasses import dataclass

from symbolic_response.expressions.names import (
    base_latex,
    default_latex,
    same_latex,
    upright,
)
from symbolic_response.expressions.tree import Expression, Symbol, symbols_of
from symbolic_response.network.checks import expressions_of
from symbolic_response.network.model import Network
from symbolic_response.network.notation_section import (
    LETTERS,
    NotationSection,
    plain_symbol_names,
    read_notation,
    symbol_names,
)
from symbolic_response.network.quantities import BarrierOf, DriveOf, EnergyOf, Perturbation


@dataclass(frozen=True, slots=True)
class Notation:
    """How one network is written: letters by role, labels by place, own symbols of perturbations.

    ``own`` gives the symbol of the file that is exactly the energy, barrier or drive a
    perturbation raises and is used for nothing else, so that the derivative by it is the response.
    ``ends``: the states each transition joins. ``indices``: what a rate carries (``transition``, or
    both states, ``to-from`` or ``from-to``). ``in_rates``: whether results are written in rates
    (``never``, ``always`` or ``shorter``). ``beta``: the inverse temperature, "" in units of k_B T.
    """

    letters: Mapping[str, str]
    symbols: Mapping[str, str]
    states: tuple[str, ...]
    transitions: tuple[str, ...]
    observables: tuple[str, ...]
    own: Mapping[Perturbation, str]
    ends: tuple[tuple[int, int], ...]
    indices: str
    in_rates: str
    beta: str

    def indexed(self, role: str, label: str) -> str:
        """Return a letter with a subscript."""
        return f"{self.letters[role]}_{{{label}}}"

    def rate(self, transition: int, backward: bool) -> str:
        """Return the LaTeX of a directed rate."""
        if self.indices == "transition":
            sign = "-" if backward else "+"
            return f"{self.letters['rate']}^{{{sign}}}_{{{self.transitions[transition]}}}"
        source, target = self.ends[transition][::-1] if backward else self.ends[transition]
        pair = (target, source) if self.indices == "to-from" else (source, target)
        letter = self.letters["generator" if self.indices == "to-from" else "rate"]
        shown = f"{letter}_{{{joined([self.states[k] for k in pair])}}}"
        alike = [e for e, ends in enumerate(self.ends) if set(ends) == {source, target}]
        return shown if len(alike) == 1 else f"{shown}^{{({self.transitions[transition]})}}"

    def energy(self, latex: str) -> str:
        """Return what an energy, barrier or drive is as a number: times the inverse temperature."""
        return f"({self.beta} {latex})" if self.beta else latex


def notation_of(network: Network) -> Notation:
    """Return the notation of a network.

    Raises NetworkError, with file and line, where the section ``[notation]`` cannot be used.
    """
    symbols = symbol_names(network)
    section = read_notation(network)
    own = _own_symbols(network)
    states = tuple(
        section.states.get(s.name) or s.latex or default_latex(s.name) for s in network.states
    )
    return Notation(
        letters=_choose_letters(plain_symbol_names(network), own, section),
        symbols=symbols,
        states=states,
        transitions=_transition_labels(network, states, section),
        observables=_observable_labels(network, section),
        own=own,
        ends=tuple((t.first, t.second) for t in network.transitions),
        indices=section.indices,
        in_rates=section.rates,
        beta=section.beta,
    )


def joined(labels: Sequence[str]) -> str:
    """Return labels side by side, with commas where one is longer than a letter or digit."""
    return ("" if all(len(label) == 1 for label in labels) else ",").join(labels)


# -- labels --------------------------------------------------------------------------------------


def _unique(preferred: list[str], otherwise: list[str]) -> tuple[str, ...]:
    distinct = len({same_latex(label) for label in preferred}) == len(preferred)
    return tuple(preferred if distinct else otherwise)


def _transition_labels(
    network: Network, states: Sequence[str], section: NotationSection
) -> tuple[str, ...]:
    """Return the label of each transition; one named after its states shows their labels."""
    labels = []
    for transition in network.transitions:
        names = [network.states[place].name for place in (transition.first, transition.second)]
        first, second = states[transition.first], states[transition.second]
        if transition.name in section.transitions:
            labels.append(section.transitions[transition.name])
        elif transition.name == "_".join(names):
            short = all(len(label) == 1 for label in (first, second))
            labels.append(first + second if short else rf"{first}\text{{-}}{second}")
        else:
            labels.append(upright(transition.name))
    return _unique(labels, [upright(transition.name) for transition in network.transitions])


def _observable_labels(network: Network, section: NotationSection) -> tuple[str, ...]:
    chosen = [section.observables.get(o.name) for o in network.observables]
    preferred = [
        label or default_latex(o.name) for label, o in zip(chosen, network.observables, strict=True)
    ]
    return _unique(preferred, [upright(o.name) for o in network.observables])


# -- letters -------------------------------------------------------------------------------------


def _own_symbols(network: Network) -> dict[Perturbation, str]:
    """Return the perturbations that are the derivative by one symbol used for nothing else."""
    uses = Counter(
        name for expression, _, _ in expressions_of(network) for name in symbols_of(expression)
    )
    energy_form = {
        end
        for t in network.transitions if t.barrier is not None
        for end in (t.first, t.second)
    }
    rate_form = {
        end
        for t in network.transitions if t.barrier is None
        for end in (t.first, t.second)
    }
    found: dict[Perturbation, str] = {}

    def note(perturbation: Perturbation, expression: Expression | None) -> None:
        if isinstance(expression, Symbol) and uses[expression.name] == 1:
            found[perturbation] = expression.name

    for place, state in enumerate(network.states):
        if place in energy_form - rate_form:
            note(EnergyOf(place), state.energy)
    for e, transition in enumerate(network.transitions):
        note(BarrierOf(e), transition.barrier)
        note(DriveOf(e), transition.drive)
    return found


def _choose_letters(
    symbols: Mapping[str, str], own: Mapping[Perturbation, str], section: NotationSection
) -> dict[str, str]:
    """Return for each role the letter asked for, or the first that no symbol has as its base."""
    exempt: dict[str, frozenset[str]] = {
        "energy": _owned(own, lambda p: isinstance(p, EnergyOf)),
        "barrier": _owned(own, lambda p: isinstance(p, BarrierOf)),
        "drive": _owned(own, lambda p: isinstance(p, DriveOf)),
    }
    chosen: dict[str, str] = dict(section.letters)
    for role, letters in LETTERS.items():
        if role in chosen:
            continue
        spared = exempt.get(role, frozenset())
        taken = _bases(latex for name, latex in symbols.items() if name not in spared)
        taken |= {same_latex(letter) for letter in (*chosen.values(), section.beta)}
        free = [letter for letter in letters if same_latex(letter) not in taken]
        chosen[role] = free[0] if free else rf"\mathrm{{{role.split()[0]}}}"
    return chosen


def _owned(
    own: Mapping[Perturbation, str], kind: Callable[[Perturbation], bool]
) -> frozenset[str]:
    return frozenset(name for perturbation, name in own.items() if kind(perturbation))


def _bases(latex: Iterable[str]) -> set[str]:
    return {same_latex(base_latex(text)) for text in latex}
