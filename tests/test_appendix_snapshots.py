"""The LaTeX of two small networks, as it was read and approved.

``python -m tests.test_appendix_snapshots`` writes them anew; read the difference before it is
committed.
"""

from __future__ import annotations

from pathlib import Path

import pytest

from symbolic_response.appendix import appendix_text
from symbolic_response.network import build_network
from symbolic_response.network.model import Network

FOLDER = Path(__file__).parent / "snapshots"


def networks() -> dict[str, tuple[Network, list[str]]]:
    pair = build_network(
        "Latch", states={"open": {"latex": "o"}, "shut": {"latex": "s"}},
        transitions=[("open", "shut", "k*c", "r", "close"), ("shut", "open", "w", "v", "pry")])
    ring = build_network(
        "Three gates", states="A B C",
        transitions=[("A", "B", "a", "b"), ("B", "C", "g", "h"), ("C", "A", "u", "v")])
    return {
        "latch": (pair, ["current[close]", "d p[shut] / d ln c", "d p[shut] / d barrier[pry]"]),
        "gates": (ring, ["p[B]", "d ln(p[A]/p[B]) / d barrier[A_B]", "d p[C] / d energy[A]"]),
    }


@pytest.mark.parametrize("name", networks())
def test_the_text_is_the_one_that_was_approved(name: str) -> None:
    network, quantities = networks()[name]
    approved = (FOLDER / f"{name}.tex").read_text(encoding="utf-8")
    assert appendix_text(network, quantities=quantities) == approved


if __name__ == "__main__":
    for key, (described, asked) in networks().items():
        text = appendix_text(described, quantities=asked)
        (FOLDER / f"{key}.tex").write_text(text, encoding="utf-8")
