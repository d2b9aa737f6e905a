"""The coefficient proof: how much of a change the trees towards one root can share.

Where ln of each directed rate changes by a number v, d ln N_k is a mean over the trees towards k of
the sum of v over their rates; after clearing N_k every coefficient of high N_k - d N_k and of
d N_k - low N_k is non-negative. Hence no ln(p_i/p_j) responds more than high - low.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from fractions import Fraction

from symbolic_response.errors import SizeLimitError
from symbolic_response.network.model import Network
from symbolic_response.response.analysis import Analysis
from symbolic_response.topology.tree_weights import tree_weights

MOST_CHANGE = 64


@dataclass(frozen=True, slots=True)
class CoefficientsProof:
    """The least and the largest sum of v over the rates of a tree directed to any root."""

    low: Fraction
    high: Fraction

    def subject(self, network: Network) -> str:
        """Return what the proof is about in the words of the file."""
        return f"{self.low} to {self.high}"


def coefficients_proof(
    analysis: Analysis, changes: Mapping[tuple[int, bool], Fraction]
) -> CoefficientsProof:
    """Return the range of the sums; ``changes``: v by transition and whether backward, 0 if left
    out. SizeLimitError where v, brought to integers, is above 64."""
    scale = math.lcm(*(v.denominator for v in changes.values()))
    whole = {key: int(v * scale) for key, v in changes.items()}
    spread = max(0, *whole.values()) - min(0, *whole.values())
    if spread > MOST_CHANGE:
        raise SizeLimitError(f"changes of rates that differ by {spread} are more than the limit of"
                             f" {MOST_CHANGE} of a proof by coefficients")
    low, high = tree_weights(analysis.graph, whole)
    return CoefficientsProof(Fraction(low, scale), Fraction(high, scale))
