"""The files of an export: FILE.py and FILE.json, all of them or none."""

from __future__ import annotations

import os
from collections.abc import Callable, Sequence
from pathlib import Path

from symbolic_response.errors import OutputError
from symbolic_response.export.asked import asked_of
from symbolic_response.export.data import json_text_of
from symbolic_response.export.module import module_text
from symbolic_response.expressions.tree import Expression
from symbolic_response.files import check_output, write_files
from symbolic_response.network.model import Network
from symbolic_response.response.analysis import Analysis, as_analysis

Quantities = Sequence[str | Expression] | None


def functions_text(subject: Network | Analysis, quantities: Quantities = None) -> str:
    """Return the Python module of :func:`export_functions` as text.

    >>> from symbolic_response.network.build import build_network
    >>> pair = build_network("pair", states="A B", transitions=[("A", "B", "k*c", "k")])
    >>> space = {}
    >>> exec(functions_text(pair, ["d p[B] / d ln c"]), space)
    >>> space["d_p_B_by_ln_c"](c=2, k=1)
    Fraction(2, 9)
    """
    analysis = as_analysis(subject)
    return module_text(analysis, asked_of(analysis.network, quantities))


def json_text(subject: Network | Analysis, quantities: Quantities = None) -> str:
    """Return the JSON of :func:`export_json` as text."""
    analysis = as_analysis(subject)
    return json_text_of(analysis, asked_of(analysis.network, quantities))


def export_functions(
    subject: Network | Analysis, path: str | os.PathLike[str], quantities: Quantities = None
) -> Path:
    """Write a Python module with a function for each quantity, the rates and the steady state.

    ``quantities``: texts or expressions; by default those of the file's [appendix], else currents,
    means, the entropy production and responses of means to the positive symbols, at most 24.
    Raises QuantityError, NetworkError, EvaluationError, SizeLimitError, OutputError.
    """
    return export_files(subject, [_with_suffix(path, ".py")], quantities)[0]


def export_json(
    subject: Network | Analysis, path: str | os.PathLike[str], quantities: Quantities = None
) -> Path:
    """Write the results as JSON, described in :mod:`symbolic_response.export.data`.

    Quantities and errors as for :func:`export_functions`.
    """
    return export_files(subject, [_with_suffix(path, ".json")], quantities)[0]


def export_files(
    subject: Network | Analysis,
    paths: Sequence[str | os.PathLike[str]],
    quantities: Quantities = None,
) -> list[Path]:
    """Write files whose suffixes say what they hold, .py or .json: all of them or none."""
    analysis = as_analysis(subject)
    check_paths(paths, analysis.network.path)
    asked = asked_of(analysis.network, quantities)
    contents: dict[Path, str | bytes] = {}
    for path in map(Path, paths):
        contents[path] = MAKERS[path.suffix.lower()](analysis, asked)
    write_files(contents)
    return list(contents)


def check_paths(paths: Sequence[str | os.PathLike[str]], network: str | None) -> None:
    """Raise OutputError for a suffix that is not known or a file that cannot be written."""
    if not paths:
        raise OutputError("give a file to write: -o FILE.py or -o FILE.json")
    for path in paths:
        if Path(path).suffix.lower() not in MAKERS:
            raise OutputError(f"{os.fspath(path)!r}: write .py or .json")
        check_output(path, network)


def _with_suffix(path: str | os.PathLike[str], suffix: str) -> str | os.PathLike[str]:
    if Path(path).suffix.lower() != suffix:
        raise OutputError(f"{os.fspath(path)!r}: the name ends in {suffix}")
    return path


MAKERS: dict[str, Callable[..., str]] = {".py": module_text, ".json": json_text_of}
