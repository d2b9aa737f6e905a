"""Formulas of labels as SVG text: letters at measured places, scripts, fractions, Greek.

Every command that an entry of a network file may hold (:mod:`network.math_latex`) has a character
or is set as what stands in its braces; an unknown one is set as its name.
"""

from __future__ import annotations

import re
from dataclasses import dataclass, field
from xml.sax.saxutils import escape

from symbolic_response.expressions.widths import TEXT, formula_width
from symbolic_response.figures.diagrams.labels import Label
from symbolic_response.figures.diagrams.svg_characters import ACCENTS, CHARACTERS, SPACES

UPRIGHT = frozenset((r"\mathrm", r"\text", r"\textrm", r"\textup", r"\textnormal", r"\mathsf",
                     r"\textsf", r"\mathtt", r"\texttt", r"\operatorname"))
BOLD = frozenset((r"\mathbf", r"\textbf", r"\boldsymbol"))
SLANTED = frozenset((r"\mathit", r"\textit", r"\mathnormal"))
DROPPED = frozenset((r"\left", r"\right", r"\big", r"\Big", r"\bigl", r"\bigr", r"\Bigl", r"\Bigr",
                     r"\displaystyle", r"\textstyle", r"\scriptstyle", r"\scriptscriptstyle",
                     r"\mathstrut"))
FRACTIONS = frozenset((r"\frac", r"\tfrac", r"\dfrac"))
PAIRS = frozenset((r"\overset", r"\underset", r"\stackrel", r"\binom"))
OTHER_FONTS = "'STIX Two Text','Times New Roman','DejaVu Serif',serif"
"""For Greek letters, which some fonts of the other letters do not have."""
BINARY, RELATIONS = frozenset("+−·×"), frozenset("=<>≤≥→")
SIZES = (1.0, 0.72, 0.55)
UP, DOWN, OVER, UNDER = 4.1, 2.1, 3.6, 3.6
_TOKEN = re.compile(r"\\[A-Za-z]+|\\.|\S")


@dataclass(frozen=True, slots=True)
class _Run:
    text: str
    x: float
    y: float
    level: int
    style: str
    width: float = 0.0


@dataclass(frozen=True, slots=True)
class _Rule:
    x: float
    y: float
    width: float


@dataclass(slots=True)
class _Setter:
    """Sets tokens from a place on, in pt at a text size of 10 pt, y upwards."""

    tokens: list[str]
    runs: list[_Run] = field(default_factory=list)
    rules: list[_Rule] = field(default_factory=list)
    place: int = 0

    def formula(self, x: float, y: float, level: int, style: str) -> float:
        """Set up to a closing brace or the end; return where it ends."""
        start = x
        widest = x
        nucleus = x
        while self.place < len(self.tokens) and self.tokens[self.place] != "}":
            token = self.tokens[self.place]
            if token in "_^":
                self.place += 1
                shift = -DOWN if token == "_" else UP
                end = self.argument(nucleus + 0.2, y + shift * SIZES[level], level + 1, style)
                widest = max(widest, end + 0.5)
            else:
                x = max(x, widest)
                x = widest = self.atom(x, y, level, style, first=x == start)
                nucleus = x
        return max(x, widest)

    def argument(self, x: float, y: float, level: int, style: str) -> float:
        """Set one token or group."""
        level = min(level, 2)
        if self.place >= len(self.tokens):
            return x
        if self.tokens[self.place] != "{":
            return self.atom(x, y, level, style, first=True)
        self.place += 1
        end = self.formula(x, y, level, style)
        self.place += 1
        return end

    def atom(self, x: float, y: float, level: int, style: str, *, first: bool) -> float:
        """Set one atom; return where it ends."""
        token = self.tokens[self.place]
        if token == "{":
            return self.argument(x, y, level, style)
        self.place += 1
        if token in UPRIGHT | BOLD | SLANTED:
            kind = "upright" if token in UPRIGHT else "bold" if token in BOLD else "italic"
            return self.argument(x, y, level, kind)
        if token in (r"\mathcal", r"\mathbb", r"\mathfrak"):
            return self.argument(x, y, level, "italic")
        if token in FRACTIONS:
            return self.fraction(x, y, level, style)
        if token in PAIRS:
            return self.argument(self.argument(x, y, level, style), y, level, style)
        if token == r"\sqrt":
            start = self.put("√", x, y, level, "upright")
            end = self.argument(start, y, level, style)
            self.rules.append(_Rule(start, y + 7.3 * SIZES[level], end - start))
            return end
        if token in ACCENTS:
            return self.accent(token, x, y, level, style)
        if token in DROPPED:
            return x
        return self.symbol(token, x, y, level, style, first)

    def symbol(
        self, token: str, x: float, y: float, level: int, style: str, first: bool
    ) -> float:
        """Set one character, operator name or space."""
        if token in SPACES:
            return x + SPACES[token] * SIZES[level]
        shown = CHARACTERS.get(token, token.removeprefix("\\"))
        if shown == "−" and style == "upright":
            shown = "-"
        space = 2.2 if shown in BINARY else 2.8 if shown in RELATIONS else 0.0
        if first or level or style == "upright":
            space = 0.0
        letter = len(shown) == 1 and shown.isalpha()
        italic = letter and (shown.isascii() or "α" <= shown <= "ϵ")
        kind = style or ("italic" if italic else "upright")
        width = _width(token, shown, level, kind)
        self.runs.append(_Run(shown, x + space, y, level, kind, width))
        named = token.startswith("\\") and len(shown) > 1
        return x + 2 * space + width + (1.7 if named and not level else 0.0)

    def put(self, text: str, x: float, y: float, level: int, style: str) -> float:
        """Set a text as it stands."""
        self.runs.append(_Run(text, x, y, level, style))
        return x + 8.3 * SIZES[level]

    def accent(self, token: str, x: float, y: float, level: int, style: str) -> float:
        """Set an accent over its argument, or a line over it."""
        before = len(self.runs)
        end = self.argument(x, y, level, style)
        if token in (r"\overline", r"\widehat", r"\widetilde", r"\overrightarrow"):
            self.rules.append(_Rule(x, y + 7.6 * SIZES[level], end - x))
        elif token == r"\underline":
            self.rules.append(_Rule(x, y - 2.0 * SIZES[level], end - x))
        elif len(self.runs) > before:
            last = self.runs[before]
            self.runs[before] = _Run(last.text + ACCENTS[token], last.x, last.y, last.level,
                                     last.style)
        return end

    def fraction(self, x: float, y: float, level: int, style: str) -> float:
        """Set a fraction: both parts in the middle of the longer one."""
        parts = []
        for shift in (OVER, -UNDER):
            first, rule = len(self.runs), len(self.rules)
            end = self.argument(x + 1.2, y + shift * SIZES[level], level + 1, style)
            parts.append((first, len(self.runs), rule, len(self.rules), end))
        longest = max(end for *_, end in parts)
        for first, last, _, _, end in parts:
            for k in range(first, last):
                run = self.runs[k]
                self.runs[k] = _Run(run.text, run.x + (longest - end) / 2, run.y, run.level,
                                    run.style, run.width)
        self.rules.append(_Rule(x + 1.2, y + 2.5 * SIZES[level], longest - x - 1.2))
        return longest + 1.2


def _width(token: str, shown: str, level: int, style: str) -> float:
    source = rf"\mathrm{{{token}}}" if style == "upright" and token.isalpha() else token
    return formula_width(source, style=(TEXT, 2, 3)[level])


def svg_label(label: Label, place: complex) -> str:
    """Return a label as SVG text centred at a point of its baseline, y downwards."""
    setter = _Setter(_TOKEN.findall(re.sub(r"\\ |~", r"\\quad ", label.latex)))
    end = setter.formula(0.0, 0.0, 0, "")
    scale = label.width / end if end else 1.0
    left, size = place.real - label.width / 2, label.size
    up = size / 10
    spans = "".join(
        f'<tspan x="{left + run.x * scale:.2f}" y="{place.imag - run.y * up:.2f}"'
        f'{_style(run, size, scale)}>{escape(run.text)}</tspan>' for run in _joined(setter.runs)
    )
    rules = "".join(
        f'<path d="M{left + rule.x * scale:.2f} {place.imag - rule.y * up:.2f}'
        f' h{rule.width * scale:.2f}" stroke="#000000" stroke-width="0.4"/>'
        for rule in setter.rules
    )
    return f'<text font-size="{size:g}">{spans}</text>{rules}'


def _joined(runs: list[_Run]) -> list[_Run]:
    """Return runs, upright letters of one word together."""
    made: list[_Run] = []
    for run in runs:
        last = made[-1] if made else None
        if (last is not None and last.style == run.style == "upright" and last.y == run.y
                and last.level == run.level and _is_word(last.text) and _is_word(run.text)):
            made[-1] = _Run(last.text + run.text, last.x, last.y, last.level, last.style,
                            run.x + run.width - last.x)
        else:
            made.append(run)
    return made


def _is_word(text: str) -> bool:
    return text.replace("_", "").isalnum() or text == "_"


def _style(run: _Run, size: float, scale: float) -> str:
    made = f' font-size="{size * SIZES[run.level]:g}"' if run.level else ""
    if not run.text.isascii() and run.text[0].isalpha():
        made += f' font-family="{OTHER_FONTS}"'
    if run.style == "italic":
        made += ' font-style="italic"'
    if len(run.text) > 1 and run.width:  # whatever the font
        made += f' textLength="{run.width * scale:.2f}" lengthAdjust="spacingAndGlyphs"'
    return made + (' font-weight="bold"' if run.style == "bold" else "")
