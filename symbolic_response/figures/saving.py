"""Writing a figure: the kind by the suffix, the same bytes for the same data, whole or not at all.
"""

from __future__ import annotations

import contextlib
import io
import os
from collections.abc import Iterator
from pathlib import Path

from matplotlib import style
from matplotlib.figure import Figure

from symbolic_response.errors import OutputError
from symbolic_response.files import check_output, write_files

METADATA: dict[str, dict[str, None]] = {
    ".pdf": {"Creator": None, "Producer": None, "CreationDate": None},
    ".png": {"Software": None},
    ".svg": {"Creator": None, "Date": None},
}
WIDTHS = {"single": 3.4, "double": 7.0}
"""Widths in inches: one column of a journal, or two."""
DOTS = 300
LABEL_SIZE = 8
STYLE: dict[str, object] = {
    "font.family": ["STIXGeneral", "DejaVu Sans"],
    "mathtext.fontset": "stix",
    "font.size": LABEL_SIZE,
    "axes.labelsize": LABEL_SIZE,
    "axes.linewidth": 0.6,
    "legend.fontsize": 7.5,
    "xtick.labelsize": 7.5,
    "ytick.labelsize": 7.5,
    "xtick.direction": "in",
    "ytick.direction": "in",
    "xtick.top": True,
    "ytick.right": True,
    "svg.hashsalt": "symbolic-response",
    "svg.fonttype": "path",
    "pdf.fonttype": 42,
}


@contextlib.contextmanager
def drawing() -> Iterator[None]:
    """Set the one style of all figures for a while, whatever the user's own settings are."""
    with style.context(["default", STYLE]):
        yield


def width_of(columns: str) -> float:
    """Return the width of a figure in inches; OutputError unless ``single`` or ``double``."""
    if columns not in WIDTHS:
        raise OutputError(f"there is no width {columns!r}; there are {', '.join(WIDTHS)}")
    return WIDTHS[columns]


def check_figure_path(path: str | os.PathLike[str]) -> str:
    """Return the suffix of a figure; OutputError where it or the place of the file is no good."""
    suffix = Path(path).suffix.lower()
    if suffix not in METADATA:
        raise OutputError(f"{str(path)!r} has no suffix of a figure; write .pdf, .png or .svg")
    check_output(path)
    return suffix


def write_figure(figure: Figure, path: str | os.PathLike[str]) -> None:
    """Write a figure as PDF, PNG or SVG; OutputError where that cannot be done."""
    suffix = check_figure_path(path)
    made = io.BytesIO()
    with drawing():
        figure.savefig(made, format=suffix[1:], dpi=DOTS, metadata=METADATA[suffix])
    write_files({Path(path): made.getvalue()})
