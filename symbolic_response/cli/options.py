"""What the verbs share: options, reading the network, making its analysis."""

from __future__ import annotations

from collections.abc import Callable
from typing import TYPE_CHECKING

import click

if TYPE_CHECKING:
    from symbolic_response.network.model import Network
    from symbolic_response.response.analysis import Analysis

json_option = click.option("--json", "as_json", is_flag=True,
                           help="One JSON object on standard output.")
quiet_option = click.option("--quiet", is_flag=True, help="No progress on standard error.")
trees_option = click.option("--trees", type=click.IntRange(min=1), metavar="N",
                      help="Enumerate up to N rooted spanning trees (default 2000000).")
terms_option = click.option("--terms", type=click.IntRange(min=1), metavar="N",
                      help="Expand polynomials up to N terms (default 200000).")
network_argument = click.argument("network", type=click.Path())


def read(path: str) -> Network:
    """Return the network of a file."""
    from symbolic_response.network.toml_reader import read_network

    return read_network(path)


def analysis_of(
    network: Network,
    progress: Callable[[int, int], None],
    trees: int | None = None,
    terms: int | None = None,
) -> Analysis:
    """Return the analysis of a network under the limits asked for."""
    from symbolic_response.response.analysis import TERM_LIMIT, TREE_LIMIT
    from symbolic_response.response.analysis import Analysis as Analysis_

    return Analysis_(
        network,
        tree_limit=trees or TREE_LIMIT,
        term_limit=terms or TERM_LIMIT,
        progress=progress,
    )
