"""What can be asked of a network: quantities and their responses, as data.

The atoms are leaves of expression trees; any tree of atoms and symbols is a quantity. States,
transitions and observables are referred to by their place in the network.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

from symbolic_response.expressions.tree import Expression, walk


@dataclass(frozen=True, slots=True)
class Probability(Expression):
    """Stationary probability of a set of states."""

    states: tuple[int, ...]


@dataclass(frozen=True, slots=True)
class Mean(Expression):
    """Stationary mean of an observable."""

    observable: int


@dataclass(frozen=True, slots=True)
class Current(Expression):
    """Net stationary current of a transition, from its first to its second state, in 1/time."""

    transition: int


@dataclass(frozen=True, slots=True)
class Traffic(Expression):
    """Forward flow plus backward flow of a transition, in 1/time."""

    transition: int


@dataclass(frozen=True, slots=True)
class DirectedRate(Expression):
    """One rate of a transition, in 1/time; the backward rate of a one-way transition is 0."""

    transition: int
    backward: bool


@dataclass(frozen=True, slots=True)
class EntropyProduction(Expression):
    """Entropy production rate, in k_B per time; each parallel channel counts by itself."""


@dataclass(frozen=True, slots=True)
class EnergyOf:
    """Raising ``energy[state]`` by eps multiplies every rate out of the state by e^eps."""

    state: int


@dataclass(frozen=True, slots=True)
class BarrierOf:
    """Raising ``barrier[transition]`` by eps multiplies both its rates by e^-eps."""

    transition: int


@dataclass(frozen=True, slots=True)
class BarriersOf:
    """Raising the barriers of several transitions by eps multiplies all their rates by e^-eps.

    Two or more different transitions, in file order.
    """

    transitions: tuple[int, ...]


@dataclass(frozen=True, slots=True)
class DriveOf:
    """Raising ``drive[transition]`` by eps multiplies its rates by e^(eps/2) and e^(-eps/2)."""

    transition: int


@dataclass(frozen=True, slots=True)
class BySymbol:
    """A symbol of the file, or its natural logarithm."""

    name: str
    logarithmic: bool = False


Perturbation = EnergyOf | BarrierOf | BarriersOf | DriveOf | BySymbol


@dataclass(frozen=True, slots=True)
class Response(Expression):
    """The derivative of a quantity by a perturbation."""

    quantity: Expression
    perturbation: Perturbation


@dataclass(frozen=True, slots=True)
class Change(Expression):
    """A quantity after a barrier has been raised by ``amount``, minus the quantity before.

    The quantity holds no response and no change; the amount is made of numbers and symbols.
    """

    quantity: Expression
    transition: int
    amount: Expression


def walk_quantity(node: Expression) -> Iterator[Expression]:
    """Yield every node of a quantity, those inside responses and changes included."""
    for part in walk(node):
        yield part
        if isinstance(part, Response | Change):
            yield from walk_quantity(part.quantity)
        if isinstance(part, Change):
            yield from walk(part.amount)
