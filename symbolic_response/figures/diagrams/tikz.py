r"""Pictures as TikZ: the styles of the preamble, pictures, grids of them, a whole document.

Packages: tikz with its library arrows.meta; labels may need amsmath and amssymb.
"""

from __future__ import annotations

from collections.abc import Sequence

from symbolic_response.figures.diagrams.geometry import Curve
from symbolic_response.figures.diagrams.labels import RATIOS, Label
from symbolic_response.figures.diagrams.looks import (
    LINES,
    MARKS,
    OUTLINE,
    Colour,
    Line,
    Mark,
    Tip,
)
from symbolic_response.figures.diagrams.pictures import Picture, Shape

COLUMN_SPACE, ROW_SKIP = 9.0, 8


def _colour(colour: Colour) -> str:
    red, green, blue = colour
    return f"{{rgb,255:red,{red};green,{green};blue,{blue}}}"


def _tip(tip: Tip) -> str:
    half = ",harpoon" if tip.half else ""
    return (f"-{{Stealth[length={tip.length:g}pt,width={tip.width:g}pt,"
            f"inset={tip.inset:g}pt{half}]}}")


def _line_style(line: Line) -> str:
    parts = [f"draw={_colour(line.colour)}", f"line width={line.width:g}pt",
             f"line cap={'round' if line.round else 'butt'}"]
    if line.dashes:
        pattern = " ".join(
            f"{'off' if place % 2 else 'on'} {length:g}pt" for place, length in
            enumerate(line.dashes)
        )
        parts.append(f"dash pattern={pattern}")
    if line.tip is not None:
        parts.append(_tip(line.tip))
    return ",".join(parts)


def _mark_style(mark: Mark) -> str:
    draw = f",draw,line width={mark.width:g}pt" if mark.width else ""
    return f"fill={_colour(mark.fill)}{draw}"


def _preamble() -> str:
    styles = [
        "diagram/.style={x=1pt,y=1pt}",
        f"diagram state/.style={{draw,line width={OUTLINE:g}pt,fill=white}}",
        *(f"diagram text {size}/.style={{anchor=base,inner sep=0pt,outer sep=0pt,"
          rf"font=\fontsize{{{size}}}{{{1.2 * size:g}}}\selectfont}}" for size in RATIOS),
        *(f"diagram {name}/.style={{{_line_style(line)}}}" for name, line in LINES.items()),
        *(f"diagram {name}/.style={{{_mark_style(mark)}}}" for name, mark in MARKS.items()),
    ]
    return ("\\usepackage{tikz}\n\\usetikzlibrary{arrows.meta}\n\\tikzset{\n"
            + "".join(f"  {style},\n" for style in styles) + "}\n")


PREAMBLE = _preamble()
"""What the preamble of a document needs, amsmath and amssymb apart."""


def number(value: float) -> str:
    """Return a length in pt to two decimals, without needless zeros.

    >>> [number(value) for value in (100.0, -0.001, 2.345678)]
    ['100', '0', '2.35']
    """
    text = f"{value:.2f}".rstrip("0").rstrip(".")
    return "0" if text == "-0" else text


def _at(place: complex) -> str:
    return f"({number(place.real)},{number(place.imag)})"


def _path(curve: Curve) -> str:
    if len(curve) == 2:
        return f"{_at(curve[0])} -- {_at(curve[1])}"
    start, one, two, end = (_at(z) for z in curve)
    return f"{start} .. controls {one} and {two} .. {end}"


def _shape(shape: Shape) -> str:
    if shape.is_circle:
        return (rf"\path[diagram state] {_at(shape.box.centre)} circle"
                f"[radius={number(shape.radius)}pt];")
    low = _at(complex(shape.box.left, shape.box.bottom))
    high = _at(complex(shape.box.right, shape.box.top))
    return (rf"\path[diagram state,rounded corners={number(shape.radius)}pt] {low} rectangle"
            f" {high};")


def _label(shown: Label) -> str:
    place = _at(complex(shown.x, shown.baseline))
    return rf"\node[diagram text {shown.size}] at {place} {{${shown.latex}$}};"


def _dot(centre: complex, look: str) -> str:
    mark = MARKS[look]
    if mark.square:
        half = complex(mark.radius, mark.radius)
        return rf"\path[diagram {look}] {_at(centre - half)} rectangle {_at(centre + half)};"
    return rf"\path[diagram {look}] {_at(centre)} circle[radius={number(mark.radius)}pt];"


def tikz_picture(picture: Picture) -> str:
    """Return one picture."""
    box = picture.box
    corners = _at(complex(box.left, box.bottom)), _at(complex(box.right, box.top))
    return "\n".join([
        r"\begin{tikzpicture}[diagram]",
        rf"\path[use as bounding box] {corners[0]} rectangle {corners[1]};",
        *(rf"\path[diagram {s.look}] {_path(s.curve)};" for s in picture.strokes),
        *(_shape(shape) for shape in picture.shapes),
        *(_dot(dot.centre, dot.look) for dot in picture.dots),
        *(_label(shown) for shown in picture.labels),
        r"\end{tikzpicture}",
    ])


def tikz_grid(rows: Sequence[Sequence[Picture]]) -> str:
    """Return pictures of the same size in rows; a lone one stands by itself."""
    if len(rows) == 1 and len(rows[0]) == 1:
        return tikz_picture(rows[0][0]) + "%\n"
    shown = f"\n\\\\ \\noalign{{\\vskip {ROW_SKIP}pt}}\n"
    body = shown.join("\n&\n".join(f"{tikz_picture(p)}%" for p in row) for row in rows)
    return ("{\\renewcommand{\\arraystretch}{0}"
            f"\\setlength{{\\tabcolsep}}{{{number(COLUMN_SPACE / 2)}pt}}%\n"
            f"\\begin{{tabular}}{{@{{}}*{{{len(rows[0])}}}{{c}}@{{}}}}\n{body}\n"
            "\\end{tabular}}%\n")


def document(body: str, margin: float = 3) -> str:
    """Return a whole document with one page, just as large as what it shows."""
    return (
        "\\documentclass{article}\n\\usepackage{amsmath,amssymb}\n" + PREAMBLE
        + "\\pagestyle{empty}\n\\begin{document}\n\\setbox0\\hbox{%\n" + body + "}%\n"
        + f"\\pdfhorigin={margin:g}pt \\pdfvorigin={margin:g}pt\n"
        + f"\\pdfpagewidth=\\dimexpr\\wd0+{2 * margin:g}pt\\relax\n"
        + f"\\pdfpageheight=\\dimexpr\\ht0+\\dp0+{2 * margin:g}pt\\relax\n"
        + "\\hoffset=0pt \\voffset=0pt\n\\shipout\\box0\n\\end{document}\n"
    )
