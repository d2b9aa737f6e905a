"""Widths and line breaks: predicted ones against TeX's own."""

from __future__ import annotations

import sys
from pathlib import Path

import pytest

sys.path.insert(0, str(Path(__file__).parent))

import tex_measure

from symbolic_response.expressions import glyph_table
from symbolic_response.expressions.breaking import (
    NUMBER_ROOM,
    Equation,
    Piece,
    align,
    break_lines,
    product_pieces,
)
from symbolic_response.expressions.widths import formula_width

FORMULAS = [
    r"k_{\mathrm{on}} c", r"k_{on} c a g - k_{off} b h",
    r"\frac{k_{on} c \cdot (k_{off} b + a g) (a + 2 b + 2 g + h)}{2 D^2}",
    r"\frac{\partial \pi_{A}}{\partial B_{\mathrm{bind}}}=",
    r"\frac{\partial \ln \pi_{\{A,B\}}}{\partial \ln c}=-",
    r"e^{E_A - B_1 + F/2} + e^{-F/2}", r"\langle \mathrm{occ} \rangle", r"J_{\mathrm{A\_B}}",
    r"w^{+}_{\mathrm{bind}} N_A - w^{-}_{\mathrm{bind}} N_B", r"w_{12}^2 (w_{AB})^{-1}",
    r"\Phi_{C,\mathrm{bind}}", r"\ln(k_1/k_2)", r"\sqrt{k_1 k_2}",
    r"\frac{\partial^2 \pi_A}{\partial E_A \, \partial F_{\mathrm{flip}}}",
    r"{}+ 3 \alpha \beta_{12} \gamma^2", r"\mathrm{ATP} \mathrm{ADP}^2", r"k_{+1} k_{-1}",
    r"\frac{1}{3} x - \frac{2}{5} (y + z)^3", r"V_1 / V_2 , d f Y Z", r"k' x''",
    r"2 \ln 2 + \ln x \ln(y)", r"\hat{k}_1 \tilde{\mu}", r"A \to B \to C", r"W_{ij}=\infty",
    r"\mathrm{Office} \mathrm{VAT}", r"\frac{\frac{a}{b}+c}{d^{e^{f}}}",
    r"k_{\text{on}} x_{\rm cat}",
    r"a\,b\quad c", r"E_{\mathrm{half}}^{f}", r"N_{s_{000}}", r"s_{000}\text{-}s_{001}",
]
WITH_HEIGHTS = [
    r"\ln\left(\frac{k_{on} c a g}{k_{off} b h}\right)", r"\ln\left(\frac{a}{c}\right)",
    r"\frac{\ln\left(\frac{a}{c}\right)}{2}", r"\sqrt{c}", r"\Bigl(\frac{a}{b}\Bigr)^2",
    r"\unknowncommand x",
]


def test_predicted_widths_are_those_of_tex(tmp_path: Path, requires_latex: None) -> None:
    found = tex_measure.measured([rf"\displaystyle {f}" for f in FORMULAS], tmp_path)
    for formula, width in zip(FORMULAS, found, strict=True):
        assert formula_width(formula) == pytest.approx(width, abs=0.01), formula


def test_assumed_heights_are_never_too_small(tmp_path: Path, requires_latex: None) -> None:
    macro = r"\newcommand{\unknowncommand}{\mathcal{M}}"
    found = tex_measure.measured([rf"\displaystyle {f}" for f in WITH_HEIGHTS], tmp_path, macro)
    for formula, width in zip(WITH_HEIGHTS, found, strict=True):
        assert width - 0.01 <= formula_width(formula) <= width + 8, formula


def test_the_table_is_what_tex_measures(tmp_path: Path, requires_latex: None) -> None:
    source = Path(glyph_table.__file__).read_text()
    assert tex_measure.glyph_table(tmp_path) == source


def test_lines_fit_and_the_last_one_leaves_room() -> None:
    pieces = [Piece("" if n == 0 else "+-"[n % 2], f"k_{{{n}}} x y") for n in range(60)]
    lines = break_lines(pieces, 200.0)
    assert [piece for line in lines for piece in line] == pieces
    for line in lines:
        text = " ".join(f"{piece.sign} {piece.body}" for piece in line)
        room = 200.0 - (NUMBER_ROOM if line is lines[-1] else 0)
        assert formula_width("{}" + text) <= room


def test_environment_of_a_broken_sum() -> None:
    pieces = (Piece("-", "a"), *[Piece("+", "b c d e")] * 12, Piece("=", "0"))
    text = align([Equation("N", pieces)], 200.0)
    assert text.startswith("\\begin{align}\nN &=- a + b c d e")
    assert " \\notag\\\\\n&\\quad{}+ b c d e" in text
    assert text.count("\\notag") == text.count("\n&")


def test_wide_left_sides_take_a_line_of_their_own() -> None:
    text = align([Equation(r"\frac{a}{b} " * 20, (Piece("", "c"),))], 200.0)
    assert " \\notag\\\\\n&\\quad = c" in text


def test_long_products_are_continued_with_a_sign() -> None:
    pieces = product_pieces([r"\mathrm{long}_{1}"] * 20, 200.0, "-")
    assert pieces[0].sign == "-" and all(p.sign == r"\times" and p.forced for p in pieces[1:])
    assert len(break_lines(pieces, 200.0)) == len(pieces) > 1
