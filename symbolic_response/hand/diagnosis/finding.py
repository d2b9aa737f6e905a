"""What a diagnosis gives: findings, and how specific each is."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Finding:
    """What went wrong, in a sentence.

    ``kind``: ``tree``, ``term``, ``factor``, ``exchange``, ``quantity``, ``network`` or ``limit``.
    Each is confirmed exactly before it is returned.
    """

    kind: str
    text: str


@dataclass(frozen=True, slots=True)
class Ranked:
    """A finding and its rank; small ranks are more specific. ``small``: one change of one term."""

    rank: int
    finding: Finding
    small: bool = False


SINGLE, EDIT, EXCHANGE, QUANTITY, NETWORK, FACTOR, LIMIT, SEVERAL, PARTIAL, VANISHING = range(10)
