"""Pictures as SVG, drawn from the same data as in TikZ, without TeX."""

from __future__ import annotations

from collections.abc import Sequence
from xml.sax.saxutils import escape

from symbolic_response.figures.diagrams.geometry import Curve, direction, part
from symbolic_response.figures.diagrams.looks import LINES, MARKS, OUTLINE, Colour, Tip
from symbolic_response.figures.diagrams.pictures import Picture, Shape, Stroke
from symbolic_response.figures.diagrams.svg_text import svg_label
from symbolic_response.figures.diagrams.tikz import COLUMN_SPACE, ROW_SKIP, number

MARGIN = 3.0
FONTS = "'Latin Modern Roman','CMU Serif','STIX Two Text','Times New Roman',Times,serif"


def svg_grid(rows: Sequence[Sequence[Picture]], title: str) -> str:
    """Return a whole SVG file of pictures in rows; lengths in pt."""
    box = rows[0][0].box
    across, down = box.width + COLUMN_SPACE, box.height + ROW_SKIP
    width = across * len(rows[0]) - COLUMN_SPACE + 2 * MARGIN
    height = down * len(rows) - ROW_SKIP + 2 * MARGIN
    lines = [
        '<?xml version="1.0" encoding="UTF-8"?>',
        f'<svg xmlns="http://www.w3.org/2000/svg" width="{number(width)}pt"'
        f' height="{number(height)}pt" viewBox="0 0 {number(width)} {number(height)}"'
        f' font-family="{FONTS}">',
        f"<title>{escape(_printable(title))}</title>",
        f'<rect width="{number(width)}" height="{number(height)}" fill="#ffffff"/>',
    ]
    for r, row in enumerate(rows):
        for c, picture in enumerate(row):
            corner = complex(MARGIN + c * across - box.left, MARGIN + r * down + box.top)
            lines += _picture(picture, corner)
    return "\n".join([*lines, "</svg>", ""])


def _printable(text: str) -> str:
    """Return a text without the control characters that XML does not have."""
    return "".join(c if c.isprintable() else " " for c in text)


def _picture(picture: Picture, corner: complex) -> list[str]:
    def moved(place: complex) -> complex:
        return complex(corner.real + place.real, corner.imag - place.imag)

    lines = ["<g>"]
    for stroke in picture.strokes:
        lines += _stroke(Stroke(tuple(moved(z) for z in stroke.curve), stroke.look,
                                stroke.transition))
    lines += [_shape(shape, moved(shape.box.centre)) for shape in picture.shapes]
    lines += [_dot(moved(dot.centre), dot.look) for dot in picture.dots]
    lines += [svg_label(shown, moved(complex(shown.x, shown.baseline)))
              for shown in picture.labels]
    return [*lines, "</g>"]


def _hex(colour: Colour) -> str:
    return "#" + "".join(f"{value:02x}" for value in colour)


def _at(place: complex) -> str:
    return f"{number(place.real)} {number(place.imag)}"


def _stroke(stroke: Stroke) -> list[str]:
    look, curve = LINES[stroke.look], stroke.curve
    dashes = f' stroke-dasharray="{" ".join(f"{d:g}" for d in look.dashes)}"' if look.dashes else ""
    cap = ' stroke-linecap="round"' if look.round else ""
    colour = _hex(look.colour)
    shown = curve if look.tip is None else _shortened(curve, look.tip.length - look.tip.inset)
    made = [f'<path d="{_path(shown)}" fill="none" stroke="{colour}"'
            f' stroke-width="{look.width:g}"{dashes}{cap}/>']
    if look.tip is not None:
        made.append(f'<path d="{_head(curve, look.tip, look.width)}" fill="{colour}"/>')
    return made


def _path(curve: Curve) -> str:
    if len(curve) == 2:
        return f"M{_at(curve[0])} L{_at(curve[1])}"
    start, one, two, end = (_at(z) for z in curve)
    return f"M{start} C{one} {two} {end}"


def _shortened(curve: Curve, length: float) -> Curve:
    """Return a curve without its last ``length`` or so."""
    speed = abs(curve[-1] - curve[-2]) * (1 if len(curve) == 2 else 3)
    return part(curve, 0.0, max(0.2, 1 - length / speed))


def _head(curve: Curve, tip: Tip, width: float) -> str:
    """Return the outline of an arrow head; y points downwards, so left is -i."""
    end, ahead = curve[-1], direction(curve, 1.0)
    left = -1j * ahead * tip.width / 2
    back, notch = end - tip.length * ahead, end - (tip.length - tip.inset) * ahead
    other = notch + 1j * ahead * width / 2 if tip.half else back - left
    front = end + 1j * ahead * width / 2 if tip.half else end
    outline = [front, end, back + left, notch, other]
    return "M" + " L".join(_at(z) for z in outline) + " Z"


def _shape(shape: Shape, centre: complex) -> str:
    style = f'fill="#ffffff" stroke="#000000" stroke-width="{OUTLINE:g}"'
    if shape.is_circle:
        return (f'<circle cx="{number(centre.real)}" cy="{number(centre.imag)}"'
                f' r="{number(shape.radius)}" {style}/>')
    return _rectangle(centre, shape.box.width, shape.box.height,
                      f'rx="{number(shape.radius)}" {style}')


def _rectangle(centre: complex, width: float, height: float, style: str) -> str:
    return (f'<rect x="{number(centre.real - width / 2)}" y="{number(centre.imag - height / 2)}"'
            f' width="{number(width)}" height="{number(height)}" {style}/>')


def _dot(centre: complex, look: str) -> str:
    mark = MARKS[look]
    style = f'fill="{_hex(mark.fill)}"'
    if mark.width:
        style += f' stroke="#000000" stroke-width="{mark.width:g}"'
    if mark.square:
        return _rectangle(centre, 2 * mark.radius, 2 * mark.radius, style)
    return (f'<circle cx="{number(centre.real)}" cy="{number(centre.imag)}"'
            f' r="{number(mark.radius)}" {style}/>')
