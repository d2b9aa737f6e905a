"""What the user describes: networks as data, their file and their exchange with Python."""

from symbolic_response.network.build import Barrier, Rates, build_network
from symbolic_response.network.interchange import (
    from_generator_matrix,
    from_networkx,
    generator_matrix,
    to_networkx,
)
from symbolic_response.network.model import Network, Observable, State, SymbolEntry, Transition
from symbolic_response.network.substitution import with_substitution
from symbolic_response.network.toml_reader import read_network, read_network_text

__all__ = [
    "Barrier", "Network", "Observable", "Rates", "State", "SymbolEntry", "Transition",
    "build_network", "from_generator_matrix", "from_networkx", "generator_matrix",
    "read_network", "read_network_text", "to_networkx", "with_substitution",
]
