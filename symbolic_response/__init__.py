"""Exact steady states, responses and thermodynamic bounds of small driven kinetic networks.

>>> import symbolic_response as sr
>>> pair = sr.build_network("pair", states="A B", transitions=[("A", "B", "k*c", "k")])
>>> print(sr.derive(pair, "p[B]").expression)
c/(c + 1)
"""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from symbolic_response.appendix import write_appendix
    from symbolic_response.bounds.report import bound
    from symbolic_response.certificates.certify import Certificate, certify
    from symbolic_response.certificates.points import Refutation
    from symbolic_response.certificates.record import write_certificate
    from symbolic_response.checker import check_file as recheck
    from symbolic_response.control.cloud import cloud
    from symbolic_response.control.limits import leading
    from symbolic_response.control.response_curve import response_curve
    from symbolic_response.control.result import Steepness, steepness
    from symbolic_response.export import export_functions, export_json
    from symbolic_response.figures.cloud import cloud_figure
    from symbolic_response.figures.curve import curve_figure
    from symbolic_response.figures.diagrams import Drawing, draw, write_drawing
    from symbolic_response.hand.compare import Comparison, compare, compare_entries
    from symbolic_response.network import (
        Barrier,
        Network,
        Rates,
        build_network,
        from_generator_matrix,
        from_networkx,
        generator_matrix,
        read_network,
        read_network_text,
        to_networkx,
        with_substitution,
    )
    from symbolic_response.response.analysis import Analysis
    from symbolic_response.response.deriving import Derived, Value, derive
    from symbolic_response.response.survey import Survey, survey

_HOMES = {
    "write_appendix": "appendix",
    **dict.fromkeys(("Certificate", "certify"), "certificates.certify"),
    "Refutation": "certificates.points",
    "write_certificate": "certificates.record",
    "bound": "bounds.report",
    "recheck": "checker",
    "cloud": "control.cloud",
    "leading": "control.limits",
    "response_curve": "control.response_curve",
    **dict.fromkeys(("Steepness", "steepness"), "control.result"),
    **dict.fromkeys(("Comparison", "compare", "compare_entries"), "hand.compare"),
    **dict.fromkeys(("Drawing", "draw", "write_drawing"), "figures.diagrams"),
    **dict.fromkeys(("export_functions", "export_json"), "export"),
    "cloud_figure": "figures.cloud",
    "curve_figure": "figures.curve",
    **dict.fromkeys(
        ("Barrier", "Network", "Rates", "build_network", "from_generator_matrix", "from_networkx",
         "generator_matrix", "read_network", "read_network_text", "to_networkx",
         "with_substitution"),
        "network",
    ),
    "Analysis": "response.analysis",
    **dict.fromkeys(("Derived", "Value", "derive"), "response.deriving"),
    **dict.fromkeys(("Survey", "survey"), "response.survey"),
}

__all__ = [
    "Analysis",
    "Barrier",
    "Certificate",
    "Comparison",
    "Derived",
    "Drawing",
    "Network",
    "Rates",
    "Refutation",
    "Steepness",
    "Survey",
    "Value",
    "bound",
    "build_network",
    "certify",
    "cloud",
    "cloud_figure",
    "compare",
    "compare_entries",
    "curve_figure",
    "derive",
    "draw",
    "export_functions",
    "export_json",
    "from_generator_matrix",
    "from_networkx",
    "generator_matrix",
    "leading",
    "read_network",
    "read_network_text",
    "recheck",
    "response_curve",
    "steepness",
    "survey",
    "to_networkx",
    "with_substitution",
    "write_appendix",
    "write_certificate",
    "write_drawing",
]


def __getattr__(name: str) -> Any:
    """Import a public name where it is first used, so that starting up stays quick."""
    if name not in _HOMES:
        raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
    inner = {"recheck": "check_file"}.get(name, name)
    return getattr(import_module(f"{__name__}.{_HOMES[name]}"), inner)


def __dir__() -> list[str]:
    return sorted(__all__)
