"""The figure of a response curve in LaTeX, drawn by the package pgfplots."""

from __future__ import annotations

from collections.abc import Callable, Sequence

from symbolic_response.control.curve_data import CurveData
from symbolic_response.figures.panels import Line, Look, Panel, panels_of

PREAMBLE = "\\usepackage{pgfplots}\n\\pgfplotsset{compat=1.15}\n"
"""What the preamble of a document needs, amsmath apart."""
DIGITS = 5
ON_A_LINE = 5


def curve_pgfplots(data: CurveData, escaped: Callable[[str], str]) -> str:
    """Return a tikzpicture of the curve and of its sensitivity, as the other figures show them.

    ``escaped`` makes LaTeX of plain text. Numbers are rounded to 5 digits, for drawing. It is as
    wide as the line; the preamble needs ``PREAMBLE``.
    """
    shown = panels_of(data)
    xs, top = [_rounded(x) for x in shown.xs], shown.lower.top
    across = ["scale only axis", r"width=0.8\linewidth", r"height=0.36\linewidth",
              *(["xmode=log"] if data.logarithmic else []), f"xmin={xs[0]}", f"xmax={xs[-1]}",
              "clip mode=individual", "unbounded coords=jump", r"label style={font=\small}",
              r"tick label style={font=\footnotesize}",
              "legend style={at={(0,1)},anchor=south west,draw=none,fill=none,"
              r"font=\footnotesize,/tikz/every even column/.append style={column sep=6pt}}",
              "legend cell align=left"]
    label = f"${data.parameter_latex}$" + _about(data.parameter_about, escaped)
    upper = [*across, "name=upper", "ymin=-0.03", "ymax=1.03", "xticklabels={}",
             "legend columns=2", _vertical(shown.upper, escaped)]
    lower = [*across, "at={(upper.south west)}", "anchor=north west", r"yshift=-2.6em",
             f"ymin={_rounded(-0.03 * top)}", f"ymax={_rounded(1.05 * top)}",
             "legend columns=3", f"xlabel={{{label}}}",
             r"xlabel style={align=center,text width=0.8\linewidth}",
             _vertical(shown.lower, escaped)]
    anchor = f"({_rounded(shown.anchor[0])},{_rounded(shown.anchor[1])})"
    named = rf"\addlegendentry{{{shown.anchor_name}}}" if shown.anchor_name else ""
    mark = "only marks,mark=*,mark size=1.5pt,mark options={draw=black,fill=white}"
    hidden = "" if shown.anchor_name else ",forget plot"
    return "\n".join([
        r"\begin{tikzpicture}",
        *_axis(upper, xs, shown.upper.lines,
               [rf"\addplot[{mark}{hidden}] coordinates {{{anchor}}};{named}"]),
        *_axis(lower, xs, shown.lower.lines, []),
        r"\end{tikzpicture}",
    ]) + "\n"


def _about(about: str, escaped: Callable[[str], str]) -> str:
    return f" ({escaped(about)})" if about.strip() else ""


def _vertical(panel: Panel, escaped: Callable[[str], str]) -> str:
    """Return the vertical label, in lines no longer than the panel is high."""
    words = f"ylabel={{${panel.latex}${_about(panel.about, escaped)}}}"
    return words + r",ylabel style={align=center,text width=0.36\linewidth}"


def _axis(
    options: Sequence[str], xs: Sequence[str], lines: Sequence[Line], more: Sequence[str]
) -> list[str]:
    made = [r"\begin{axis}[", *(f"  {option}," for option in options), "]"]
    for line in lines:
        values = ["nan" if value is None else _rounded(value) for value in line.values]
        pairs = [f"({x},{y})" for x, y in zip(xs, values, strict=True)]
        made += [rf"\addplot[{_style(line.look)}] coordinates {{",
                 *("  " + " ".join(pairs[start:start + ON_A_LINE])
                   for start in range(0, len(pairs), ON_A_LINE)),
                 rf"}};\addlegendentry{{{line.look.name}}}"]
    return [*made, *more, r"\end{axis}"]


def _style(look: Look) -> str:
    """Return the look of a line as options."""
    red, green, blue = look.colour
    dashes = " ".join(f"{'off' if place % 2 else 'on'} {length:g}pt"
                      for place, length in enumerate(look.dashes))
    pattern = f"dash pattern={dashes}" if dashes else "solid"
    return (f"mark=none,color={{rgb,255:red,{red};green,{green};blue,{blue}}},"
            f"line width={look.width:g}pt,{pattern}")


def _rounded(value: float) -> str:
    return f"{value:.{DIGITS}g}"
